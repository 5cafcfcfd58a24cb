object "Curlew" {
  redshift = 0.212
  centre   = sky("14h01m02.1s", "+02d52m42s")
}
cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3
}
nuisance "huge" { prior = normal(1e400, 1) }
nuisance "zero" { prior = normal(1/0, 1) }
lensing "arc" {
  estimate "a" {
    method     = "ring"
    radius     = "18.4 ± 0 arcsec"
    source_redshift = 1e-400
  }
  estimate "b" {
    method = "ring"
    radius = .5
  }
  estimate "c" {
    method = "ring"
    radius = "NaN +- 1 kpc"
  }
  estimate "d" {
    method = "ring"
    radius = null
    source_redshift = "1.5"  # a number in quotes is one
  }
  estimate "e" {
    method = "ring"
    radius = normal("18 arcsec", "10 kpc")
    source_redshift = true
  }
  estimate "f" {
    method = "ring"
    radius = "-18 +- 1 arcsec"
    source_redshift = [1.5]
  }
}
