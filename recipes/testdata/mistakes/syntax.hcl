object "Curlew" {
  redshift = 0.212
  redshift = 0.213
}
cosmology {
  hubble_constant = 70 km/s/Mpc
  omega_matter    = 0.3
  omega_lamda     = 0.7
}
xray 'spectra' {
}
dynamics "sigma"
{
  dispersion { value = "970 +- 30 km/s", within = "1 Mpc" }
}
