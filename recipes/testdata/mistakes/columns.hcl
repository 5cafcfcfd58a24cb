object "Curlew" {
  redshift = 0.212
  centre   = sky("14h01m02.1s", "+02d52m42s")
}
cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3
}
lensing "shapes" {
  galaxies {
    file   = "shape.fits"
    ra     = "ra"
    dec    = column("dec", "arcmni")
    e1     = column("e1", "kpc")
    weight = column()
    family = column("f", "deg")
    redshift = colum("z")
  }
  bins {
    from  = 0.2
    to    = "3 keV"
    count = "10"
  }
  estimate "nfw" {
    method     = "tangential-shear"
    halo       = "nfw"
    covariance = ["shape", "structure"]
  }
}
xray "spectra" {
  density {
    inner = column("r_in", "kpc")
    value = column("n", "keV")
  }
  temperature {
    file       = "temperature.csv"
    inner      = column("r_in")
    outer      = column("r_out")
    half_width = column("dr")
    value      = column("kT", "")
    error      = column("e")
    minus      = column("lo")
  }
  estimate "backward" { method = "backward" }
}
