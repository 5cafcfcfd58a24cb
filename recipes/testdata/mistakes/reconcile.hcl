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
reconcile {
  estimates = [dynamics.sigma.scaling]
  at        = [overdensity(500)]
  preferred = [reported.earlier, dynamics.sigma.scaling, dynamics.sigma.scaling, dynamics.sigma]
  combined  = "random"
}
