# One estimate of every kind, on the data of the example, with few draws: the recipe by
# which the outputs of every kind are pinned.

object "Curlew" {
  redshift = 0.212
  centre   = sky("14h01m02.1s", "+02d52m42s") # ICRS
}

cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3 # flat, since omega_lambda is not given
}

sampling {
  draws = 200
  seed  = 7
}

# Systematic errors that more than one estimate may share are declared once. An
# estimate feels one when it names it.
nuisance "elongation" { prior = lognormal(1.0, 0.10) } # along the line of sight

xray "spectra" {
  density {
    file = "../../../recipes/examples/curlew/density.ecsv"
    inner = column("r_in") # this file states its units
    outer = column("r_out")
    value = column("n_e")
    error = column("n_e_err")
  }
  temperature {
    file = "../../../recipes/examples/curlew/temperature.csv"
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
  estimate "forward" { method = "forward" }
}

xray "published" {
  density {
    model = "beta"
    n0    = "0.01 cm-3"
    rc    = "150 kpc"
    beta  = 0.65
  }
  temperature {
    file  = "../../../recipes/examples/curlew/temperature.csv"
    inner = column("r_in", "arcmin")
    outer = column("r_out", "arcmin")
    value = column("kT", "keV")
    minus = column("kT_lo", "keV")
    plus  = column("kT_hi", "keV")
  }
  estimate "closed" { method = "isothermal-beta" }
}

lensing "shapes" {
  galaxies {
    file = "../../../recipes/examples/curlew/shapes.fits"
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
  estimate "cylinder" {
    method  = "aperture"
    radius  = "1 Mpc"
    control = ["2 Mpc", "3 Mpc"]
  }
  estimate "with_ring" {
    method          = "combined"
    radius          = "15 +- 1 arcsec"
    source_redshift = 2
  }
}

lensing "arc" {
  estimate "ring" {
    method          = "einstein-radius"
    radius          = "15 +- 1 arcsec"
    source_redshift = 2
  }
}

lensing "arcs" {
  images {
    file     = "images.csv"
    source   = column("source")
    ra       = column("ra", "deg")
    dec      = column("dec", "deg")
    error    = column("error", "arcsec")
    redshift = column("z")
  }
  estimate "images" {
    method = "image-positions"
    halo   = "isothermal"
  }
}

dynamics "redshifts" {
  galaxies {
    file = "../../../recipes/examples/curlew/redshifts.csv"
    ra       = column("ra", "deg")
    dec      = column("dec", "deg")
    redshift = column("z")
    error    = column("ez")
  }
  members { method = "shifting-gapper" }
  elongation = nuisance.elongation

  estimate "scaling" { method = "dispersion-scaling" }
  estimate "virial" { method = "virial" }
  estimate "projected" { method = "projected-mass" }
  estimate "jeans" { method = "jeans" }
  estimate "caustic" { method = "caustic" }
  estimate "half_light" {
    method            = "half-light"
    half_light_radius = "400 +- 20 kpc"
  }
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
