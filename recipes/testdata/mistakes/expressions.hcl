object "Curlew" {
  redshift = 0.1 + 0.112
}
cosmology {
  hubble_constant = "${70} km/s/Mpc"
  omega_matter    = true ? 0.3 : 0.27
  w0              = -"1"
  wa              = { value = 0 }
  omega_lambda    = 2 > 1
  cmb_temperature = [for x in [1]: x]
}
sampling {
  draws = 10.5
  seed  = max(1, 2)
}
dynamics "sigma" {
  dispersion { value = x[0] }
  estimate "scaling" { method = 3 }
}
reported "sums" {
  probe         = "xray"
  mass          = "6.1" + "0.9"
  overdensity   = 5 * "100"
  concentration = 4.5 +- 0.3
}
