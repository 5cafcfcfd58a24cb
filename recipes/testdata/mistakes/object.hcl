object {
  redshift = -0.2
  center   = "14h01m02.1s +02d52m42s"
}
cosmology {
  H0           = 70
  omega_matter = "0.3 +- 0.01"
}
dynamics "sigma" {
  dispersion { value = "970 +- 30 km/s" }
  estimate "scaling" { method = "dispersion-scaling" }
}
