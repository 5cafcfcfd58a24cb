package halo

import (
	"math"

	"steelyard/probes/constants"
)

// Isothermal is the singular isothermal sphere of one-dimensional dispersion
// Sigma, km/s,
//
//	ρ = σ²/(2πG r²)
//
// (Binney & Tremaine 2008, section 4.3.3). Its mass grows without end.
type Isothermal struct{ Sigma float64 }

// NewIsothermal returns the sphere with the given mass at mean density threshold.
func NewIsothermal(mass, threshold float64) Isothermal {
	return Isothermal{math.Sqrt(constants.G * mass / (2 * sphereRadius(mass, threshold)))}
}

// Density is ρ(r).
func (h Isothermal) Density(r float64) float64 {
	return h.Sigma * h.Sigma / (2 * math.Pi * constants.G * r * r)
}

// Mass is M(<r) = 2σ² r/G.
func (h Isothermal) Mass(r float64) float64 { return 2 * h.Sigma * h.Sigma * r / constants.G }

// SurfaceDensity is Σ = σ²/(2GR).
func (h Isothermal) SurfaceDensity(R float64) float64 {
	return h.Sigma * h.Sigma / (2 * constants.G * R)
}

// MeanSurfaceDensity is the mean of Σ inside R, σ²/(GR).
func (h Isothermal) MeanSurfaceDensity(R float64) float64 {
	return h.Sigma * h.Sigma / (constants.G * R)
}

// ExcessSurfaceDensity is ΔΣ, equal to Σ.
func (h Isothermal) ExcessSurfaceDensity(R float64) float64 { return h.SurfaceDensity(R) }

// ProjectedMass is the mass in the cylinder of radius R, πσ² R/G.
func (h Isothermal) ProjectedMass(R float64) float64 {
	return math.Pi * h.Sigma * h.Sigma * R / constants.G
}

// Potential is φ = 2σ² ln(r/1 kpc), zero at 1 kpc, for it has no limit at
// infinity: only its differences mean something.
func (h Isothermal) Potential(r float64) float64 { return 2 * h.Sigma * h.Sigma * math.Log(r) }

// EscapeSpeed is +Inf: nothing leaves a halo of infinite mass.
func (h Isothermal) EscapeSpeed(float64) float64 { return math.Inf(1) }
