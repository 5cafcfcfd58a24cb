package cosmology

import (
	"math"

	"steelyard/probes/constants"
)

// SigmaCritical is the critical surface density
//
//	Σ_cr = c²/(4πG) · D_s/(D_l D_ls)
//
// in Msun per physical kpc², +Inf for a source that is not behind the lens.
func (c *Cosmology) SigmaCritical(lens, source float64) float64 {
	beta := c.Efficiency(lens, source)
	if beta == 0 {
		return math.Inf(1)
	}
	return constants.LensingMass / (c.AngularDiameter(lens) * beta)
}

// Efficiency is β = D_ls/D_s, 0 for a source that is not behind the lens. It
// costs a fraction of a microsecond.
func (c *Cosmology) Efficiency(lens, source float64) float64 {
	if source <= lens {
		return 0
	}
	xl, _ := c.since(lens)
	xs, _ := c.since(source)
	return c.curve(xs-xl) / c.curve(xs)
}

// EfficiencyInfinity is β for a source at infinite redshift.
func (c *Cosmology) EfficiencyInfinity(lens float64) float64 {
	return c.Efficiency(lens, math.Inf(1))
}
