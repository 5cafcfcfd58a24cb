include = ["inc/a.hcl", "inc/missing.hcl", 3]
object "Curlew" {
  redshift = 0.212
}
