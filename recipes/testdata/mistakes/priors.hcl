object "Curlew" {
  redshift = 0.212
  centre   = sky("14h01m02.1s", "+02d52m42s")
}
cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3
}
nuisance "a" { prior = normal(1.0, -0.1) }
nuisance "b" { prior = uniform(2, 1) }
nuisance "c" { prior = lognormal(-1, 0.1) }
nuisance "d" { prior = loguniform(0, 1) }
nuisance "e" { prior = norml(1, 0.1) }
nuisance "f" { prior = normal(1) }
nuisance "g" { prior = 1.0 }
nuisance "h" { prior = normal(1, "0.1 +- 0.01") }
nuisance "i" { prior = normal("62 deg", 3) }
nuisance "j" { prior = sky(1, 2) }
nuisance "k" { prior = gaussian(1, 0.1) }
nuisance "l" { prior = half_normal(0.1, 0.2) }
nuisance "m" { prior = normal(normal(1, 0.1), 0.1) }
nuisance "n" { }
reported "a" {
  probe       = "sz"
  mass        = normal("5e14 solMass", "1e14 solMass")
  overdensity = 500
}
