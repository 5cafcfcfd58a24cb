nuisance "x" { prior = normal(0, 2) }
