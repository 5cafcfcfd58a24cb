// Package recipes reads the language in which an object is weighed, checks what
// it says against the methods there are, and reports every mistake in it at
// once. This page is the reference of that language.
//
// A recipe is a text file that declares one object and everything needed to
// weigh it: its data files, the estimates to make from them, and how to compare
// those estimates. It declares; it does not compute. It is meant to be kept
// under version control beside the data.
//
// Go programs start at [Load], which returns a [Recipe] or [Diagnostics].
//
// # Form
//
// A recipe is written in HCL. A setting is a name, an equals sign and a value on
// one line; a block is a name, for some blocks a label in quotes, and settings
// and further blocks in braces. Order does not matter. A comment begins with #
// or // and ends with its line, or stands between /* and */.
//
//	object "Curlew" {
//	  redshift = 0.212
//	  centre   = sky("14h01m02.1s", "+02d52m42s")   # ICRS
//	}
//
//	cosmology {
//	  hubble_constant = "70 km/s/Mpc"
//	  omega_matter    = 0.3                         # flat, unless omega_lambda is given
//	}
//
// These are the blocks:
//
//   - object: what is weighed. Exactly one.
//   - cosmology: the background in which every estimate is made. Exactly one.
//   - sampling: how many draws are kept. Optional.
//   - nuisance: a systematic error that several estimates share. Any number.
//   - xray, lensing, dynamics: one probe's data and the estimates made from
//     them. Any number.
//   - reported: a mass that somebody published. Any number.
//   - reconcile: which estimates are compared, and where. Optional: without it
//     masses are printed and nothing is compared.
//
// The blocks baryons, rotation, gravity, offset, table, figure and cohort belong
// to the language and are refused for now: this version cannot read them yet.
//
// A label that is referred to begins with a letter and goes on with letters,
// digits, underscores and hyphens. The name of the object is free.
//
// # Numbers and quantities
//
// A pure number is written plainly: 0.3, -2, 1.5e14. Numbers may be multiplied
// and divided, as in 1/1.05; they are exact decimals until they are rounded once
// to double precision.
//
// A quantity with a unit is a text in quotes: a number, perhaps an error, and
// the unit.
//
//   - "0.2 Mpc", "3 arcmin", "70 km/s/Mpc", "5e14 solMass": exact.
//   - "18.4 +- 0.6 arcsec": with a symmetric error; ± does as well.
//   - "6.1 +0.9 -0.8 10**14 solMass": with two errors. The 16th, 50th and 84th
//     percentiles are 5.3, 6.1 and 7.0.
//
// Units follow the VOUnits recommendation of the IVOA (solMass, cm**-3,
// 10**14 solMass); the spellings of FITS and CDS tables (cm-3, km s-1, Msun) and
// repeated slashes (km/s/Mpc) are read as well. A temperature of gas is an
// energy, in keV. A unit that is missing, unknown or of the wrong kind is a
// mistake, except that zero needs none. Where a length is expected an angle may
// stand: the cosmology converts it at the redshift of the object.
//
// # One rule for every assumption
//
// Every physical assumption that is a number may be given as a number, as a
// prior, or as a reference to a shared nuisance. A number is exact. A prior
// belongs to its estimate alone: the assumption is drawn anew with every draw of
// the mass. A nuisance is drawn once and felt by every estimate that names it,
// so that its error is correlated between them.
//
// These functions state a prior; their arguments are numbers or quantities:
//
//   - normal(mean, sd)
//   - half_normal(sd): the positive half of a normal about zero
//   - lognormal(median, sd_of_ln): the second is the standard deviation of the
//     natural logarithm, a pure number
//   - uniform(lo, hi)
//   - loguniform(lo, hi): flat in the logarithm
//
// A quantity with an error is a prior too: normal, or with two errors a
// two-piece normal. A concentration may also be given by a published relation
// with its scatter, as relation("duffy-2008").
//
//	nuisance "temperature_scale" { prior = normal(1.0, 0.04) }
//	nuisance "elongation"        { prior = lognormal(1.0, 0.10) }
//
// A nuisance is referred to as nuisance.temperature_scale. One that nothing
// refers to draws a warning.
//
// # Object
//
// Its label is the name that is printed. The redshift is an exact positive
// number. The centre is needed as soon as positions are read, and is
// sky(ra, dec): sexagesimal ("14h01m02.1s", "14:01:02.1" or "14 01 02.1" for the
// right ascension, in hours; "+02d52m42s" or "+02:52:42" for the declination), or
// decimal degrees, sky(210.25875, 2.87833) or with deg behind them.
//
// # Cosmology
//
// All its numbers are exact: hubble_constant and omega_matter, which must be
// given; omega_lambda, without which space is flat; w0 (-1) and wa (0) of dark
// energy w(a) = w0 + wa (1 - a); cmb_temperature (0, which leaves radiation out).
//
// # Sampling
//
// draws is the number of draws kept of every estimate, 4000 when silent; seed, 1
// when silent, is a whole number: another one gives other draws of the same
// posterior.
//
//	sampling {
//	  draws = 4000
//	  seed  = 7
//	}
//
// # A probe's block
//
// It holds data blocks, any number of estimates of these data, and assumptions.
// An assumption that stands beside the estimates holds for all of them whose
// method has it; one inside an estimate goes before it. A setting that no method
// of the block has is a mistake. `steelyard methods NAME` prints the settings of
// a method, its equation, its sources, and what holds when the recipe is silent.
//
//	xray "spectra" {
//	  density {
//	    file  = "density.ecsv"
//	    inner = column("r_in",  "arcmin")
//	    outer = column("r_out", "arcmin")
//	    value = column("n_e",   "cm-3")
//	    error = column("n_e_err", "cm-3")
//	  }
//	  temperature {
//	    file  = "temperature.csv"
//	    inner = column("r_in",  "arcmin")
//	    outer = column("r_out", "arcmin")
//	    value = column("kT",    "keV")
//	    minus = column("kT_lo", "keV")
//	    plus  = column("kT_hi", "keV")
//	  }
//	  temperature_scale = nuisance.temperature_scale
//
//	  estimate "backward" {
//	    method = "backward"
//	    halo   = "nfw"
//	  }
//	}
//
// An estimate is referred to by three names: xray.spectra.backward.
//
// # Data files and columns
//
// file names a table, relative to the file that says so: CSV, text in columns
// with a header line, ECSV, or a FITS binary table. Every column that is used is
// named, column(name) or column(name, unit). The unit may be left out where the
// file states it, and must not contradict the file.
//
// Bins are placed by inner and outer, or by radius and half_width. Errors are
// given as error (symmetric), as minus and plus (sizes, both positive), or as
// low and high (the bounds of the interval).
//
// For xray:
//
//   - density: electron density of shells, value in cm**-3. Or, without a file,
//     the parameters of a published model.
//   - temperature: kT of annuli, value in keV; projected = false says that the
//     temperatures are deprojected already.
//
// For lensing:
//
//   - galaxies: a catalogue of shapes, with ra, dec, e1, e2 and, where known,
//     weight and redshift. handedness says which way the x axis of the shapes
//     points.
//   - bins: the bins in which the galaxies are averaged, equal in the logarithm
//     of the radius: from, to, count.
//   - profile: a tangential shear that is binned already, value; cross for the
//     other component; source_redshift for the sources behind it, or a block
//     sources with a table of redshift and weight.
//
// For dynamics:
//
//   - galaxies: a catalogue of redshifts, with ra, dec, redshift and, where
//     known, error.
//   - members: how members are told from the field; method = "given" when the
//     file holds members only.
//   - dispersion: a published velocity dispersion in place of a catalogue.
//
// Here are a catalogue of shapes and one of redshifts:
//
//	lensing "shapes" {
//	  galaxies {
//	    file     = "shapes.fits"
//	    ra       = column("ra")
//	    dec      = column("dec")
//	    e1       = column("e1")
//	    e2       = column("e2")
//	    weight   = column("w")
//	    redshift = column("zphot")
//	    select   = "zphot > 0.4 && flag == 0"
//	  }
//	  bins {
//	    from  = "0.2 Mpc"
//	    to    = "3 Mpc"
//	    count = 10
//	  }
//	  shear_bias = normal(0.0, 0.02)
//	  elongation = nuisance.elongation
//
//	  estimate "nfw" {
//	    method        = "tangential-shear"
//	    halo          = "nfw"
//	    covariance    = ["shape"]
//	    concentration = lognormal(4.5, 0.3)
//	  }
//	}
//
//	dynamics "redshifts" {
//	  galaxies {
//	    file     = "redshifts.csv"
//	    ra       = column("ra", "deg")
//	    dec      = column("dec", "deg")
//	    redshift = column("z")
//	    error    = column("ez")
//	    select   = "separation < '2 Mpc' && quality != 'poor'"
//	  }
//	  members { method = "shifting-gapper" }
//	  estimate "scaling" { method = "dispersion-scaling" }
//	}
//
// and a shear profile and a dispersion from the literature:
//
//	lensing "published" {
//	  profile {
//	    file            = "shear.csv"
//	    inner           = column("rmin", "arcmin")
//	    outer           = column("rmax", "arcmin")
//	    value           = column("gt")
//	    error           = column("gt_err")
//	    source_redshift = 0.9
//	  }
//	  estimate "nfw" {
//	    method     = "tangential-shear"
//	    halo       = "nfw"
//	    covariance = ["shape"]
//	    fit_within = ["0.3 Mpc", "3 Mpc"]
//	  }
//	}
//
//	dynamics "quoted" {
//	  dispersion {
//	    value   = "970 +- 30 km/s"
//	    within  = "1.5 Mpc"
//	    members = 120
//	  }
//	  estimate "scaling" { method = "dispersion-scaling" }
//	}
//
// # Selecting rows
//
// select is a condition on the columns of the file, by the names they have
// there, used otherwise or not. It is made of
//
//   - columns, and numbers;
//   - texts in single quotes, to be compared with a column of texts;
//   - quantities in single quotes, to be compared with a column that has a unit;
//   - == != < <= > >=, + - * /, && || ! and parentheses.
//
// Spaces stand around a minus sign, for mag-2 would be one name. A column whose
// name is not a single word is column('B-V'). In the galaxies blocks separation
// is the distance from the object's centre, an angle or a length.
//
// A condition whose outcome depends on a missing value, or on a division by
// zero, is not fulfilled, and neither is its opposite: the row is left out.
//
// # Published masses
//
// probe says what a reported mass was measured by: "xray", "lensing", "dynamics"
// or "sz". mass has its error. overdensity or radius says within what. via says
// how the mass was made, and so how it moves when the cosmology does:
// "hydrostatic" (so for xray when silent), "jeans", "virial" (for dynamics),
// "caustic", "shear" (for lensing), "strong-lensing", "dispersion-scaling" or
// "gas-mass" (for sz). A mass from lensing takes a source_redshift;
// projected = true says that the mass is that in a cylinder along the line of
// sight, within a radius. The cosmology it was quoted in is the recipe's when
// silent. concentration, an assumption like any other, is that of the halo along
// which the mass is carried to other radii; elongation and intrinsic_scatter are
// as in an estimate. source is printed with it.
//
//	reported "earlier_shear" {
//	  probe         = "lensing"
//	  mass          = "6.1 +0.9 -0.8 10**14 solMass"
//	  overdensity   = 500
//	  concentration = lognormal(4.0, 0.3)
//	  cosmology {
//	    hubble_constant = "73 km/s/Mpc"
//	    omega_matter    = 0.27
//	  }
//	  source        = "a value invented for this example"
//	}
//
// An overdensity is a number, times the critical density; overdensity(200,
// "mean") is times the mean density of matter, and overdensity("virial") that of
// Bryan & Norman (1998), known in a flat background with a cosmological constant
// only. A reported mass is referred to by two names: reported.earlier_shear.
//
// # Reconcile
//
// estimates lists the masses to compare. at lists where: overdensity(…) or
// radius(length). With overdensities radii_from must say whose radii are meant:
// an estimate, at whose median radius then every estimate is read, or "own", with
// which each is read at its own. limits, [2, 3, 5] when silent, are the sigmas
// that part consistent, strained, in tension and incompatible. Of several
// estimates made from the same data one enters the agreement and the combined
// mass: the first, or the one that preferred lists. combined, "linear" when
// silent, says which combined mass goes into tables; "random-effects" allows for
// scatter beyond the errors.
//
//	reconcile {
//	  estimates  = [xray.spectra.backward, lensing.shapes.nfw, dynamics.redshifts.scaling]
//	  at         = [overdensity(2500), overdensity(500), radius("1 Mpc")]
//	  radii_from = lensing.shapes.nfw
//	}
//
// # Settings shared by many recipes
//
// include, outside every block, names files whose blocks count as the recipe's
// own; any block but object may stand in them, and they may include others. A
// block in the recipe replaces an included one of the same kind and label. Paths
// are relative to the file that names them.
//
//	include = ["../survey.hcl"]
//
// # Mistakes
//
// All mistakes are reported together, in the order of the file, each with its
// place and with what to write instead. Nothing is computed from a recipe that
// has one.
//
//	recipe.hcl:3:3: error: object has no setting center
//	    3 |   center   = sky("14h01m02.1s", "+02d52m42s")
//	      |   ^^^^^^
//	   Did you mean centre?
package recipes
