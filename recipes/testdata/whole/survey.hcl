# Settings shared by many recipes.
cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3
}

nuisance "temperature_scale" { prior = normal(1.0, 0.10) }   # replaced by the recipe's
nuisance "elongation"        { prior = lognormal(1.0, 0.10) }
nuisance "unused_here"       { prior = uniform(0, 1) }
