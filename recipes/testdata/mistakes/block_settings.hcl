object "Curlew" {
  redshift = 0.212
  centre   = sky("14h01m02.1s", "+02d52m42s")
}
cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3
}
lensing "arc" {
  shear_bias = normal(0, 0.02)
  estimate "ring" {
    method          = "ring"
    radius          = "18.4 +- 0.6 arcsec"
    shear_bias      = 0.1
  }
}
