object "Curlew" {
  redshift = 0.212
  centre   = sky("14h01m02.1s", "+02d52m42s")
}
cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3
}
lensing "a" {
  galaxies {
    file   = "shapes.fits"
    ra     = column("ra")
    dec    = column("dec")
    e1     = column("e1")
    e2     = column("e2")
    select = "zphot > 0.4 and flag == 0"
  }
  bins {
    from = "0.2 Mpc"
    to   = "3 Mpc"
  }
  estimate "nfw" {
    method     = "tangential-shear"
    halo       = "nfw"
    covariance = ["shape"]
  }
}
lensing "b" {
  galaxies {
    file   = "shapes.fits"
    ra     = column("ra", "deg")
    dec    = column("dec")
    e1     = column("e1")
    e2     = column("e2")
    select = "type == \"late\" && mag-2 > 0"
  }
  galaxies {
    file   = "shapes.fits"
    select = "0.3 < z < 0.5"
  }
  bins {
    from   = "0.2 Mpc"
    to     = "3 Mpc"
    select = "z > 0"
  }
  estimate "nfw" {
    method     = "tangential-shear"
    halo       = "nfw"
    covariance = ["shape"]
  }
}
dynamics "c" {
  galaxies {
    file     = "redshifts.csv"
    ra       = column("ra", "deg")
    dec      = column("dec", "deg")
    redshift = column("z")
    select   = "ra > '2 keV'"
  }
  members { method = "given" }
  estimate "s" { method = "dispersion-scaling" }
}
dynamics "d" {
  galaxies {
    file     = "redshifts.csv"
    ra       = column("ra", "deg")
    dec      = column("dec", "deg")
    redshift = column("z")
    select   = "flag = 0"
  }
  members { method = "given" }
  estimate "s" { method = "dispersion-scaling" }
}
dynamics "e" {
  galaxies {
    file     = "redshifts.csv"
    ra       = column("ra", "deg")
    dec      = column("dec", "deg")
    redshift = column("z")
    select   = "flag"
  }
  members { method = "given" }
  estimate "s" { method = "dispersion-scaling" }
}
dynamics "f" {
  galaxies {
    file     = "redshifts.csv"
    ra       = column("ra", "deg")
    dec      = column("dec", "deg")
    redshift = column("z")
    select   = "(z > 0.1"
  }
  members { method = "given" }
  estimate "s" { method = "dispersion-scaling" }
}
dynamics "g" {
  galaxies {
    file     = "redshifts.csv"
    ra       = column("ra", "deg")
    dec      = column("dec", "deg")
    redshift = column("z")
    select   = "log10(z) > 0.1 && separation < '2 Mpcs'"
  }
  members { method = "given" }
  estimate "s" { method = "dispersion-scaling" }
}
