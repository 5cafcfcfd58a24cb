object "Curlew" {
  redshift = 0.212
  centre   = sky("14h01m02.1s", "+02d52m42s")
}
cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3
}
reported "a" {
  probe           = "radio"
  mass            = "5e14 solMass"
  overdensity     = 500
  radius          = "1 Mpc"
  source_redshift = 0.2
}
reported "b" {
  probe           = "xray"
  via             = "hydrostatics"
  mass            = "5 +- 1 keV"
  overdensity     = 500
  projected       = true
  source_redshift = 1.0
  cosmology { omega_matter = 0.3 }
}
reported "c" {
  mass = 5e14
}
