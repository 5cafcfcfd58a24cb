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
lensnig "shapes" {
  profile { file = "profile.csv" }
}
estimate "loose" { method = "dispersion-scaling" }
redshift = 0.3
baryons "visible" {
  gas = xray.spectra
}
rotation "disc" { }
gravity "law" { law = "simple" }
offset "north" { }
table "masses" { format = "latex" }
figure "profiles" { of = "mass" }
cohort "survey" { recipes = ["*.hcl"] }
widget "x" { }
