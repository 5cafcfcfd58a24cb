object "Curlew" {
  redshift = 0.212
  centre   = sky("14h01m02.1s", "+02d52m42s")
}
cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3
}
dynamics "sigma" {
  dispersion { value = "970 +- 30 km/s" }
  estimate "scaling" { method = "dispersion-scaling" }
}
reported "a" {
  probe  = "lensing"
  mass   = "5 +- 1 10**14 solMass"
  radius = "1 Mpc"
}
nuisance "never" { prior = normal(0, 1) }
reconcile {
  estimates  = [dynamics.sigma.scaling, reported.a]
  at         = [radius("1 Mpc")]
  radii_from = "own"
}
