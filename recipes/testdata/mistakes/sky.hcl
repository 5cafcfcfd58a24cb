object "Curlew" {
  redshift = object.redshift
  centre   = sky("14h61m02.1s", "+95d52m42s")
}
cosmology {
  hubble_constant = 70
  omega_matter    = normal(0.3, 0.01)
  omega_lambda    = nuisance.lambda
}
reported "a" {
  probe       = "xray"
  mass        = "5 +- 1 10**14 solMass"
  overdensity = overdensity("virial")
}
