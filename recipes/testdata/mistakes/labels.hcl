object "Curlew" {
  redshift = 0.212
  centre   = sky("14h01m02.1s", "+02d52m42s")
}
cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3
}
nuisance "2d" { prior = normal(1, 0.1) }
nuisance "a" "b" { prior = normal(1, 0.1) }
dynamics {
  dispersion { value = "970 +- 30 km/s" }
  estimate "my scaling" { method = "dispersion-scaling" }
}
cosmology "flat" {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3
}
