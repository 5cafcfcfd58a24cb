object "Curlew" {
  redshift = 0.212
  centre   = sky("14h01m02.1s", "+02d52m42s")
}
cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3
}
reported "a" {
  probe = "xray"
  mass  = "5e14 solMass"
}
