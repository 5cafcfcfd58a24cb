object "Curlew" {
  redshift = 0.212
}
object "Plover" {
  redshift = 0.3
}
cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3
}
cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3
}
dynamics "sigma" {
  dispersion { value = "970 +- 30 km/s" }
  estimate "scaling" { method = "dispersion-scaling" }
}
dynamics "sigma" {
  estimate "other" { method = "dispersion-scaling" }
}
