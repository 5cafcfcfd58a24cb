object "Curlew" {
  redshift = 0.212
cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_mater     = 0.3
}
