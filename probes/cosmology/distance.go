package cosmology

import (
	"math"

	"steelyard/probes/constants"
)

// curve turns a comoving distance along the line of sight, in units of c/H0,
// into a transverse one.
func (c *Cosmology) curve(x float64) float64 {
	switch {
	case c.curvature > 0:
		return math.Sinh(c.root*x) / c.root
	case c.curvature < 0:
		return math.Sin(c.root*x) / c.root
	}
	return x
}

// Comoving is the comoving distance along the line of sight in kpc,
// D_C = (c/H0) ∫dz/E.
func (c *Cosmology) Comoving(z float64) float64 {
	x, _ := c.since(z)
	return c.hubble * x
}

// TransverseComoving is D_M in comoving kpc: D_C, bent by the curvature
// (Hogg 1999, eq. 16).
func (c *Cosmology) TransverseComoving(z float64) float64 {
	x, _ := c.since(z)
	return c.hubble * c.curve(x)
}

// AngularDiameter is D_A = D_M/(1+z) in physical kpc, which is also the number
// of kpc a radian.
func (c *Cosmology) AngularDiameter(z float64) float64 {
	return c.TransverseComoving(z) / (1 + z)
}

// AngularDiameterBetween is D_A from z1 to z2 in physical kpc, negative when
// z2 < z1. Curvature acts on the difference of the comoving distances
// (equivalent to Hogg 1999, eq. 19, and valid in a closed universe too).
func (c *Cosmology) AngularDiameterBetween(z1, z2 float64) float64 {
	x1, _ := c.since(z1)
	x2, _ := c.since(z2)
	return c.hubble * c.curve(x2-x1) / (1 + z2)
}

// LuminosityDistance is D_L = (1+z) D_M in kpc.
func (c *Cosmology) LuminosityDistance(z float64) float64 {
	return c.TransverseComoving(z) * (1 + z)
}

// DistanceModulus is 5 log10(D_L/10 pc), −Inf at z = 0.
func (c *Cosmology) DistanceModulus(z float64) float64 {
	return 5 * math.Log10(c.LuminosityDistance(z)*1e2)
}

// KpcPerArcsec is the physical length an arcsecond spans at z, in kpc.
func (c *Cosmology) KpcPerArcsec(z float64) float64 {
	return c.AngularDiameter(z) * math.Pi / (180 * 3600)
}

// hubbleTime is 1/H0 in Gyr.
func (c *Cosmology) hubbleTime() float64 {
	return constants.SecondsPerHubble / c.p.HubbleConstant / constants.Gigayear
}

// LookbackTime is the time since z in Gyr (Julian years).
func (c *Cosmology) LookbackTime(z float64) float64 {
	_, t := c.since(z)
	return c.hubbleTime() * t
}

// Age is the time from the big bang to z in Gyr (Julian years).
func (c *Cosmology) Age(z float64) float64 {
	_, t := c.since(z)
	return c.hubbleTime() * (c.past.lookback[panels] - t)
}
