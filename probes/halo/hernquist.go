package halo

import (
	"math"

	"steelyard/probes/constants"
)

// Hernquist is the profile of Hernquist 1990,
//
//	ρ = M a/(2π r (r+a)³),
//
// of total mass M = Total, Msun, and scale radius a = Scale, kpc.
type Hernquist struct{ Total, Scale float64 }

// NewHernquist returns the halo with the given mass inside the radius r_Δ of
// mean density threshold. Its concentration is r_Δ/r₋₂ as for the other models,
// r₋₂ = a/2 being where d ln ρ/d ln r = −2.
func NewHernquist(mass, concentration, threshold float64) Hernquist {
	y := 1 + 2/concentration // (r_Δ+a)/r_Δ
	return Hernquist{Total: mass * y * y, Scale: 2 * sphereRadius(mass, threshold) / concentration}
}

// Density is ρ(r).
func (h Hernquist) Density(r float64) float64 {
	y := r + h.Scale
	return h.Total * h.Scale / (2 * math.Pi * r * y * y * y)
}

// Mass is M(<r) = M r²/(r+a)².
func (h Hernquist) Mass(r float64) float64 {
	s := r / (r + h.Scale)
	return h.Total * s * s
}

// hernquistNear is the distance from s = 1 within which Σ is taken from a
// series: |u| < 0.053, so that twelve terms reach 1e-15; outside, the closed form
// keeps 13 digits.
const hernquistNear = 0.1

// hernquistSeries holds the coefficients of [(2+s²)f − 1]/(1−s²) · 4/(1+u)² in
// powers of u = (1−s)/(1+s), f being surfaceFactor(s).
var hernquistSeries = func() (h [12]float64) {
	f := func(k float64) float64 { return (4*k + 4) / ((2*k + 1) * (2*k + 3)) }
	for i := range h {
		k := float64(i)
		h[i] = (3*f(k+1) + 2*f(k) + 3*f(k-1)) / 4
	}
	h[0] = (3*f(1) + 2*f(0)) / 4
	return h
}()

// SurfaceDensity is
//
//	Σ = M/(2πa²(1−s²)²) · [(2+s²) A(s) − 3],   s = R/a
//
// (Hernquist 1990).
func (h Hernquist) SurfaceDensity(R float64) float64 {
	s := R / h.Scale
	scale := h.Total / (2 * math.Pi * h.Scale * h.Scale)
	if math.Abs(s-1) < hernquistNear {
		u := (1 - s) / (1 + s)
		var sum float64
		for k := len(hernquistSeries) - 1; k >= 0; k-- {
			sum = sum*u + hernquistSeries[k]
		}
		return scale * sum * (1 + u) * (1 + u) / 4
	}
	q := (1 - s) * (1 + s)
	return scale * ((2+s*s)*arc(s) - 3) / (q * q)
}

// MeanSurfaceDensity is the mean of Σ inside R, M/(πa²) · (1−A(s))/(s²−1).
func (h Hernquist) MeanSurfaceDensity(R float64) float64 {
	s := R / h.Scale
	return h.Total / (math.Pi * h.Scale * h.Scale) * surfaceFactor(s, arc(s))
}

// ExcessSurfaceDensity is ΔΣ(R).
func (h Hernquist) ExcessSurfaceDensity(R float64) float64 {
	return h.MeanSurfaceDensity(R) - h.SurfaceDensity(R)
}

// ProjectedMass is the mass in the cylinder of radius R.
func (h Hernquist) ProjectedMass(R float64) float64 {
	return math.Pi * R * R * h.MeanSurfaceDensity(R)
}

// Potential is φ = −GM/(r+a), zero at infinity.
func (h Hernquist) Potential(r float64) float64 { return -constants.G * h.Total / (r + h.Scale) }

// EscapeSpeed is √(−2φ).
func (h Hernquist) EscapeSpeed(r float64) float64 { return math.Sqrt(-2 * h.Potential(r)) }
