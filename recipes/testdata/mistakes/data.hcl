object "Curlew" {
  redshift = 0.212
  centre   = sky("14h01m02.1s", "+02d52m42s")
}
cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3
}
xray "spectra" {
  temperature {
    file  = "temperature.csv"
    inner = column("r_in", "kpc")
    outer = column("r_out", "kpc")
    value = column("kT", "keV")
    error = column("e", "keV")
  }
  estimate "backward" { method = "backward" }
  estimate "forward"  { method = "forward" }
}
xray "nothing" {
}
xray "model" {
  density { }
  temperature {
    file      = ""
    projected = "yes"
  }
  surface_brightness { }
  estimate "backward" {
    method     = "backward"
    halo       = "einasto"
    fit_within = ["3 Mpc", "0.3 Mpc"]
    temperature_scale = 12
  }
}
dynamics "both" {
  galaxies {
    file     = "redshifts.csv"
    ra       = column("ra", "deg")
    dec      = column("dec", "deg")
    redshift = column("z")
  }
  members "mine" { method = "shifting-gaper" }
  dispersion { value = "970 km/s" }
  estimate "sigma" { method = "dispersion-scaling" }
  estimate "sigma" {
    method        = "dispersion-scaling"
    velocity_bias = normal(9, 1)
    overdensity   = "virial"
    note          = 3
  }
}
lensing "file" {
  profile {
    file   = "../mistakes"
    radius = column("r", "kpc")
    half_width = column("dr", "kpc")
    value  = column("g")
    low    = column("lo")
    high   = column("hi")
    sources {
      file   = "absent/n_of_z.csv"
      weight = column("n")
    }
  }
  estimate "nfw" {
    method     = "tangential-shear"
    covariance = ["shape", "shape"]
  }
}
