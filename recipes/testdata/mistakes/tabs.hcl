object "Curlew" {
	redshift = "0.2	keV" # a tab before and inside
}
object_é_ñ "x" {}
