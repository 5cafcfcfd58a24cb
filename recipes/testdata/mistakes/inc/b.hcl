include = ["../include_cycle.hcl", "a.hcl"]
object "Plover" {
  redshift = 0.3
}
nuisance "x" { prior = normal(0, 1) }
