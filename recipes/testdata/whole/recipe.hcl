# The example of the language, as far as it is built.

include = ["survey.hcl"]

object "Curlew" {
  redshift = 0.212
  centre   = sky("14h01m02.1s", "+02d52m42s")      # ICRS
}

sampling {                                         # optional
  draws = 4000
  seed  = 7
}

nuisance "temperature_scale" { prior = normal(1.0, 0.04) }

xray "spectra" {
  density {
    file  = "density.ecsv"
    inner = column("r_in",  "arcmin")
    outer = column("r_out", "arcmin")
    value = column("n_e",   "cm-3")
    error = column("n_e_err", "cm-3")
  }
  temperature {
    file  = "temperature.csv"
    inner = column("r_in",  "arcmin")
    outer = column("r_out", "arcmin")
    value = column("kT",    "keV")
    minus = column("kT_lo", "keV")
    plus  = column("kT_hi", "keV")
  }
  temperature_scale = nuisance.temperature_scale

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
    select   = "zphot > 0.4 && flag == 0"
  }
  bins {
    from  = "0.2 Mpc"
    to    = "3 Mpc"
    count = 10
  }
  shear_bias = normal(0.0, 0.02)
  elongation = nuisance.elongation

  estimate "nfw" {
    method        = "tangential-shear"
    halo          = "nfw"
    covariance    = ["shape"]
    concentration = lognormal(4.5, 0.3)
  }
}

lensing "arc" {
  estimate "ring" {
    method          = "ring"
    radius          = "18.4 +- 0.6 arcsec"
    source_redshift = 1.52
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
  estimate "sigma" { method = "dispersion-scaling" }
}

reported "earlier_shear" {
  probe       = "lensing"
  mass        = "6.1 +0.9 -0.8 10**14 solMass"
  overdensity = 500
  concentration = lognormal(4.0, 0.3)
  cosmology {
    hubble_constant = "73 km/s/Mpc"
    omega_matter    = 0.27
  }
  source      = "a value invented for this example"
}

reconcile {
  estimates  = [xray.spectra.backward, lensing.shapes.nfw, dynamics.redshifts.sigma]
  at         = [overdensity(2500), overdensity(500), radius("1 Mpc")]
  radii_from = lensing.shapes.nfw
}
