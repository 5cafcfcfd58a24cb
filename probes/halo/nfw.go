package halo

import (
	"math"

	"steelyard/probes/constants"
)

// NFW is the profile of Navarro, Frenk & White 1997,
//
//	ρ = ρ_s/(x (1+x)²),   x = r/r_s.
//
// The projections are the closed forms of Bartelmann 1996 and of Wright &
// Brainerd 2000, arranged so that no digits are lost near r_s or far from it:
// good to 1e-13 for x of 1e-6 to 1e6.
type NFW struct{ RhoS, Rs float64 }

// NewNFW returns the NFW halo whose mean density inside r_Δ = c·Rs is
// threshold (Msun/kpc³) and whose mass inside r_Δ is mass.
func NewNFW(mass, concentration, threshold float64) NFW {
	rs := sphereRadius(mass, threshold) / concentration
	return NFW{
		RhoS: mass / (4 * math.Pi * rs * rs * rs * nfwMass(concentration)),
		Rs:   rs,
	}
}

// nfwMass is m(x) = ln(1+x) − x/(1+x), the mass in units of 4πρ_s r_s³.
func nfwMass(x float64) float64 {
	t := x / (1 + x)
	if x > 0.1 {
		return math.Log(1+x) - t
	}
	// m = −ln(1−t) − t = t²/2 + t³/3 + …; t < 0.091
	var sum float64
	for k := 15; k >= 2; k-- {
		sum = sum*t + 1/float64(k)
	}
	return sum * t * t
}

// nfwProjected is g/x², with g = ln(x/2) + A(x) the projected mass in units of
// 4πρ_s r_s³: the mean surface density in units of 4ρ_s r_s.
func nfwProjected(x, a float64) float64 {
	if x > 0.3 {
		return (math.Log(x/2) + a) / (x * x)
	}
	// With q = √(1−x²) and L = ln(2/x) the leading terms of g cancel in
	// g = [L x²/(1+q) + ln(1 − x²/(2(1+q)))]/q.
	q := math.Sqrt((1 - x) * (1 + x))
	e := x * x / (2 * (1 + q))
	return (math.Log(2/x)/(1+q) + math.Log1p(-e)/(x*x)) / q
}

// Density is ρ(r).
func (h NFW) Density(r float64) float64 {
	x := r / h.Rs
	return h.RhoS / (x * (1 + x) * (1 + x))
}

// Mass is M(<r) = 4πρ_s r_s³ [ln(1+x) − x/(1+x)].
func (h NFW) Mass(r float64) float64 {
	return 4 * math.Pi * h.RhoS * h.Rs * h.Rs * h.Rs * nfwMass(r/h.Rs)
}

// Projected returns Σ(R) and its mean inside R for little more than the price of one.
func (h NFW) Projected(R float64) (surface, mean float64) {
	x := R / h.Rs
	a := arc(x)
	scale := 2 * h.RhoS * h.Rs
	return scale * surfaceFactor(x, a), 2 * scale * nfwProjected(x, a)
}

// SurfaceDensity is Σ(R).
func (h NFW) SurfaceDensity(R float64) float64 {
	x := R / h.Rs
	return 2 * h.RhoS * h.Rs * surfaceFactor(x, arc(x))
}

// MeanSurfaceDensity is the mean of Σ inside R.
func (h NFW) MeanSurfaceDensity(R float64) float64 {
	_, mean := h.Projected(R)
	return mean
}

// ExcessSurfaceDensity is ΔΣ(R).
func (h NFW) ExcessSurfaceDensity(R float64) float64 {
	surface, mean := h.Projected(R)
	return mean - surface
}

// ProjectedMass is the mass in the cylinder of radius R.
func (h NFW) ProjectedMass(R float64) float64 {
	return math.Pi * R * R * h.MeanSurfaceDensity(R)
}

// Potential is φ = −4πGρ_s r_s² ln(1+x)/x, zero at infinity.
func (h NFW) Potential(r float64) float64 {
	x := r / h.Rs
	return -4 * math.Pi * constants.G * h.RhoS * h.Rs * h.Rs * math.Log1p(x) / x
}

// EscapeSpeed is √(−2φ).
func (h NFW) EscapeSpeed(r float64) float64 { return math.Sqrt(-2 * h.Potential(r)) }
