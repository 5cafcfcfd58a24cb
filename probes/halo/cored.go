package halo

import (
	"math"

	"steelyard/probes/constants"
)

// CoredIsothermal is an isothermal sphere with a core,
//
//	ρ = σ²/(2πG (r² + r_c²)),
//
// of dispersion σ = Sigma, km/s, where r is large and core radius r_c = Core,
// kpc (the non-singular sphere of lensing; Kormann, Schneider & Bartelmann 1994,
// in the limit of no ellipticity). Its mass grows without end.
type CoredIsothermal struct{ Sigma, Core float64 }

// NewCoredIsothermal returns the sphere of that core radius with the given mass
// inside the radius of mean density threshold.
func NewCoredIsothermal(mass, core, threshold float64) CoredIsothermal {
	r := sphereRadius(mass, threshold)
	return CoredIsothermal{Sigma: math.Sqrt(constants.G * mass / (2 * core * lessArctan(r/core))), Core: core}
}

// lessArctan is x − arctan x.
func lessArctan(x float64) float64 {
	if x > 0.2 {
		return x - math.Atan(x)
	}
	var sum float64
	for k := 23; k >= 3; k -= 2 { // x³/3 − x⁵/5 + …
		sum = 1/float64(k) - sum*x*x
	}
	return sum * x * x * x
}

// Density is ρ(r).
func (h CoredIsothermal) Density(r float64) float64 {
	return h.Sigma * h.Sigma / (2 * math.Pi * constants.G * (r*r + h.Core*h.Core))
}

// Mass is M(<r) = 2σ² r_c/G · [x − arctan x], x = r/r_c.
func (h CoredIsothermal) Mass(r float64) float64 {
	return 2 * h.Sigma * h.Sigma * h.Core / constants.G * lessArctan(r/h.Core)
}

// SurfaceDensity is Σ = σ²/(2G √(R²+r_c²)).
func (h CoredIsothermal) SurfaceDensity(R float64) float64 {
	return h.Sigma * h.Sigma / (2 * constants.G * math.Sqrt(R*R+h.Core*h.Core))
}

// MeanSurfaceDensity is the mean of Σ inside R, σ²/(G (√(R²+r_c²) + r_c)).
func (h CoredIsothermal) MeanSurfaceDensity(R float64) float64 {
	return h.Sigma * h.Sigma / (constants.G * (math.Sqrt(R*R+h.Core*h.Core) + h.Core))
}

// ExcessSurfaceDensity is ΔΣ(R), written so that no digits cancel in the core.
func (h CoredIsothermal) ExcessSurfaceDensity(R float64) float64 {
	s := math.Sqrt(R*R + h.Core*h.Core)
	t := R / (s + h.Core)
	return h.Sigma * h.Sigma / (2 * constants.G) * t * t / s
}

// ProjectedMass is the mass in the cylinder of radius R.
func (h CoredIsothermal) ProjectedMass(R float64) float64 {
	return math.Pi * R * R * h.MeanSurfaceDensity(R)
}

// Potential is φ = 2σ² [ln √(1+x²) − (x − arctan x)/x], zero at the centre, for it
// has no limit at infinity.
func (h CoredIsothermal) Potential(r float64) float64 {
	x := r / h.Core
	return 2 * h.Sigma * h.Sigma * (math.Log1p(x*x)/2 - lessArctan(x)/x)
}

// EscapeSpeed is +Inf: nothing leaves a halo of infinite mass.
func (h CoredIsothermal) EscapeSpeed(float64) float64 { return math.Inf(1) }
