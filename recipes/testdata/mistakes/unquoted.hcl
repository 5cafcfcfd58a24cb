object "Curlew" {
  redshift = 0.212
}
cosmology {
  hubble_constant = 70 km/s/Mpc   # as it is often printed
  omega_matter    = 0.3 ± 0.01
}
reported "a" {
  probe         = xray
  mass          = 6.1 +0.9 -0.8 10**14 solMass
  overdensity   = 500 x
  concentration = 4.0 @ z
}
