include = ["b.hcl"]
cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_mater     = 0.3
}
