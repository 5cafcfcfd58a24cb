package lensing

import "math"

// centre is the point on the sky about which components are taken.
type centre struct {
	ra, sinDec, cosDec float64
}

func newCentre(ra, dec float64) centre {
	s, c := math.Sincos(dec)
	return centre{ra, s, c}
}

// place is where a galaxy stands as seen from the centre.
type place struct {
	angle      float64 // separation on the sphere, radians
	cos2, sin2 float64 // of twice the direction φ away from the centre, at the galaxy, counted from east to north
	// eastward and northward are the direction of the galaxy as seen at the
	// centre, not normalised.
	eastward, northward float64
}

// locate places a galaxy at right ascension ra and declination dec (radians).
// It works through right ascension zero and at the poles: meridians that
// converge turn the axes of a shape, and φ is counted from those at the galaxy.
// At the centre itself, and at its antipode, the direction is undefined and
// cos2, sin2 are NaN.
func (c centre) locate(ra, dec float64) place {
	sinDec, cosDec := math.Sincos(dec)
	sinRA, cosRA := math.Sincos(ra - c.ra)
	// The great circle from the galaxy back to the centre, on the galaxy's axes.
	east := -c.cosDec * sinRA
	north := c.sinDec*cosDec - c.cosDec*sinDec*cosRA
	e2, n2 := east*east, north*north
	s2 := e2 + n2
	return place{
		angle:     math.Atan2(math.Sqrt(s2), c.sinDec*sinDec+c.cosDec*cosDec*cosRA),
		cos2:      (e2 - n2) / s2,
		sin2:      2 * east * north / s2,
		eastward:  cosDec * sinRA,
		northward: sinDec*c.cosDec - cosDec*c.sinDec*cosRA,
	}
}

// components turns an ellipticity on the axes east and north into its
// tangential and cross components about the centre:
//
//	e_t = −(e1 cos 2φ + e2 sin 2φ)
//	e_x =   e1 sin 2φ − e2 cos 2φ
func (p place) components(e1, e2 float64) (tangential, cross float64) {
	return -(e1*p.cos2 + e2*p.sin2), e1*p.sin2 - e2*p.cos2
}
