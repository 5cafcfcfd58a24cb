object "Curlew" {
  redshift = 0.212
  centre   = sky("14h01m02.1s", "+02d52m42s")
}
cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3
}
nuisance "scale" { prior = normal(1.0, 0.1) }
nuisance "tilt"  { prior = normal("62 deg", "3 deg") }
nuisance "ring"  { prior = nuisance.round }
nuisance "round" { prior = nuisance.ring }
nuisance "alias" { prior = nuisance.scale }
lensing "shapes" {
  profile {
    file            = "profile.csv"
    inner           = column("r_in", "arcmin")
    outer           = column("r_out", "arcmin")
    value           = column("gt")
    error           = column("egt")
    source_redshift = nuisance.scale
  }
  shear_bias = nuisance.scal
  elongation = nuisance.tilt
  estimate "nfw" {
    method        = "tangential-shear"
    halo          = nfw
    covariance    = "shape"
    mass          = nuisance.scale
    concentration = relation("dufy-2008")
  }
}
reconcile {
  estimates  = [lensing.shapes, "lensing.shapes.nfw", lensing.shapes.nwf, lensing.shapes.nfw, lensing.shapes.nfw, reconcile.estimates]
  at         = [500, "1 Mpc", radius(1), overdensity("mean"), overdensity(500), overdensity(500), radius("-1 Mpc"), density(500)]
  radii_from = "lensing.shapes.nfw"
  limits     = [3, 2, 5]
}
