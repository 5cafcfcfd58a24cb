# Curlew: a relaxed cluster in a sky of our own, weighed three ways.
#
# All data are invented, from one halo whose masses stand in truth.json. Weigh it with
#
#   go run ./cmd/steelyard weigh recipes/examples/curlew/recipe.hcl

object "Curlew" {
  redshift = 0.212
  centre   = sky("14h01m02.1s", "+02d52m42s") # ICRS
}

cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3 # flat, since omega_lambda is not given
}

sampling {
  draws = 4000
  seed  = 7
}

# Systematic errors that more than one estimate may share are declared once. An
# estimate feels one when it names it.
nuisance "elongation" { prior = lognormal(1.0, 0.10) } # along the line of sight

xray "spectra" {
  density {
    file  = "density.ecsv"
    inner = column("r_in") # this file states its units
    outer = column("r_out")
    value = column("n_e")
    error = column("n_e_err")
  }
  temperature {
    file  = "temperature.csv"
    inner = column("r_in", "arcmin")
    outer = column("r_out", "arcmin")
    value = column("kT", "keV")
    minus = column("kT_lo", "keV")
    plus  = column("kT_hi", "keV")
  }
  temperature_scale = normal(1.0, 0.04) # cross-calibration of the spectrometer

  estimate "backward" {
    method = "backward"
    halo   = "nfw"
  }
}

lensing "shapes" {
  galaxies {
    file     = "shapes.fits"
    ra       = column("ra")
    dec      = column("dec")
    e1       = column("e1")
    e2       = column("e2")
    weight   = column("w")
    redshift = column("zphot")
    select   = "zphot > 0.3 && zphot < 3"
  }
  bins { # logarithmic
    from  = "0.25 Mpc"
    to    = "3 Mpc"
    count = 10
  }
  shear_bias = normal(0.0, 0.02)
  elongation = nuisance.elongation

  estimate "nfw" {
    method        = "tangential-shear"
    halo          = "nfw"
    concentration = lognormal(4.5, 0.3)
  }
}

dynamics "redshifts" {
  galaxies {
    file     = "redshifts.csv"
    ra       = column("ra", "deg")
    dec      = column("dec", "deg")
    redshift = column("z")
    error    = column("ez")
  }
  members { method = "shifting-gapper" }
  elongation = nuisance.elongation

  estimate "scaling" { method = "dispersion-scaling" }
  estimate "virial" { method = "virial" }
}

reported "earlier_shear" { # a mass someone published
  probe         = "lensing"
  mass          = "6.1 +0.9 -0.8 10**14 solMass"
  overdensity   = 500
  concentration = lognormal(4.0, 0.3)
  cosmology {
    hubble_constant = "73 km/s/Mpc"
    omega_matter    = 0.27
  }
  source_redshift = 0.9
  source          = "a value invented for this example"
}

reconcile {
  estimates  = [xray.spectra.backward, lensing.shapes.nfw, dynamics.redshifts.scaling]
  at         = [overdensity(500), radius("1 Mpc")]
  radii_from = lensing.shapes.nfw # whose R_500 is the matched radius
}
