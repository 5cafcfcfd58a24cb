package halo

import (
	"math"

	"steelyard/probes/constants"
)

// Beta is the profile that describes gas in hydrostatic equilibrium where
// temperature is constant (Cavaliere & Fusco-Femiano 1978),
//
//	ρ = ρ₀ (1 + x²)^(−3β/2),   x = r/r_c,
//
// with ρ₀ = Rho0, Msun/kpc³, and r_c = Core, kpc. For β ≤ 1 its mass is
// infinite; for β ≤ 1/3 its surface density is infinite too.
type Beta struct{ Rho0, Core, Beta float64 }

// Density is ρ(r).
func (h Beta) Density(r float64) float64 {
	x := r / h.Core
	return h.Rho0 * math.Exp(-1.5*h.Beta*math.Log1p(x*x))
}

// Mass is M(<r) = 4πρ₀r_c³ ∫ sinh²u (cosh u)^(1−3β) du, u from 0 to arsinh x, by
// quadrature good to 1e-13.
func (h Beta) Mass(r float64) float64 {
	power := 1 - 3*h.Beta
	end := math.Asinh(r / h.Core)
	pieces := math.Ceil(end)
	var sum float64
	for i := range int(pieces) {
		sum += piece(func(u float64) float64 {
			s := math.Sinh(u)
			return s * s * math.Exp(power*math.Log1p(s*s)/2)
		}, float64(i)*end/pieces, float64(i+1)*end/pieces)
	}
	return 4 * math.Pi * h.Rho0 * h.Core * h.Core * h.Core * sum
}

// central is Σ(0) = √π ρ₀ r_c Γ(3β/2−1/2)/Γ(3β/2).
func (h Beta) central() float64 {
	if h.Beta <= 1.0/3 {
		return math.Inf(1)
	}
	return math.SqrtPi * h.Rho0 * h.Core * math.Gamma(1.5*h.Beta-0.5) / math.Gamma(1.5*h.Beta)
}

// SurfaceDensity is Σ = Σ(0) (1 + x²)^(1/2−3β/2).
func (h Beta) SurfaceDensity(R float64) float64 {
	x := R / h.Core
	return h.central() * math.Exp((0.5-1.5*h.Beta)*math.Log1p(x*x))
}

// powerMean is ((1+y)^p − 1)/p from ln(1+y), or its limit ln(1+y) at p = 0.
func powerMean(p, log float64) float64 {
	if p == 0 {
		return log
	}
	return math.Expm1(p*log) / p
}

// MeanSurfaceDensity is the mean of Σ inside R, Σ(0) [(1+x²)^p − 1]/(p x²) with
// p = 3/2 − 3β/2.
func (h Beta) MeanSurfaceDensity(R float64) float64 {
	y := R * R / (h.Core * h.Core)
	return h.central() * powerMean(1.5-1.5*h.Beta, math.Log1p(y)) / y
}

// ExcessSurfaceDensity is ΔΣ(R); deep in the core, where mean and value cancel, it
// is their series −Σ_k binom(p−1, k) k/(k+1) x^2k.
func (h Beta) ExcessSurfaceDensity(R float64) float64 {
	y := R * R / (h.Core * h.Core)
	if y > 0.01 {
		return h.MeanSurfaceDensity(R) - h.SurfaceDensity(R)
	}
	power := 0.5 - 1.5*h.Beta
	term, sum := 1.0, 0.0
	for k := 1.0; k <= 9; k++ {
		term *= (power - k + 1) / k * y
		sum -= term * k / (k + 1)
	}
	return h.central() * sum
}

// ProjectedMass is the mass in the cylinder of radius R.
func (h Beta) ProjectedMass(R float64) float64 {
	return math.Pi * R * R * h.MeanSurfaceDensity(R)
}

// Potential is
//
//	φ = −GM(<r)/r + 2πGρ₀r_c² [(1+x²)^q − C]/q,   q = 1 − 3β/2,
//
// zero at infinity (C = 0) for β > 2/3; for smaller β, where it has no limit, zero
// at the centre (C = 1).
func (h Beta) Potential(r float64) float64 {
	x := r / h.Core
	q, log := 1-1.5*h.Beta, math.Log1p(x*x)
	outer := powerMean(q, log)
	if q < 0 {
		outer = math.Exp(q*log) / q
	}
	return constants.G * (2*math.Pi*h.Rho0*h.Core*h.Core*outer - h.Mass(r)/r)
}

// EscapeSpeed is √(−2φ) for β > 2/3, otherwise +Inf.
func (h Beta) EscapeSpeed(r float64) float64 {
	if h.Beta <= 2.0/3 {
		return math.Inf(1)
	}
	return math.Sqrt(-2 * h.Potential(r))
}
