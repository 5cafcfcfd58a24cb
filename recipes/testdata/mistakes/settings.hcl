object "Curlew" {
  redshift = 0.212
  centre   = sky("14h01m02.1s", "+02d52m42s")
}
cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3
}
lensing "shapes" {
  profile {
    file   = "profile.csv"
    radius = column("r", "arcmin")
    value  = column("gt")
    eror   = column("egt")
    source_redshift = 0.1
  }
  sheer_bias        = 0.01
  temperature_scale = 1.1
  estimate "nfw" {
    method     = "tangential-sheer"
    halo       = "nfw"
  }
  estimate "arc" {
    method          = "ring"
    halo            = "nfw"
    radius          = "18.4 arcsec"
    source_redshift = 1.5
    profile { }
  }
}
