package halo

import (
	"math"

	"gonum.org/v1/gonum/mathext"

	"steelyard/probes/constants"
)

// Einasto is the profile of Einasto 1965,
//
//	ρ = ρ_s exp(−(2/α) [x^α − 1]),   x = r/r_s,
//
// with ρ_s = RhoS, Msun/kpc³, and r_s = Rs, kpc, the density and the radius where
// d ln ρ/d ln r = −2 (r₋₂). α rises from 0.16
// for galaxies to 0.25 for the largest clusters (Gao et al. 2008; from memory).
type Einasto struct{ RhoS, Rs, Alpha float64 }

// NewEinasto returns the halo whose mean density inside r_Δ = c·Rs is
// threshold and whose mass inside r_Δ is mass.
func NewEinasto(mass, concentration, alpha, threshold float64) Einasto {
	rs := sphereRadius(mass, threshold) / concentration
	unit := Einasto{RhoS: 1, Rs: rs, Alpha: alpha}
	return Einasto{RhoS: mass / unit.Mass(rs*concentration), Rs: rs, Alpha: alpha}
}

// depth is the exponent (2/α) x^α.
func (h Einasto) depth(r float64) float64 {
	return 2 / h.Alpha * math.Exp(h.Alpha*math.Log(r/h.Rs))
}

// moment is 4π ∫₀^∞ ρ r^(n−1) dr = 4πρ_s r_s^n e^(2/α) (α/2)^(n/α) Γ(n/α)/α.
func (h Einasto) moment(n float64) float64 {
	gamma, _ := math.Lgamma(n / h.Alpha)
	return 4 * math.Pi * h.RhoS / h.Alpha * math.Exp(n*math.Log(h.Rs)+2/h.Alpha+n/h.Alpha*math.Log(h.Alpha/2)+gamma)
}

// Density is ρ(r).
func (h Einasto) Density(r float64) float64 {
	return h.RhoS * math.Exp(2/h.Alpha-h.depth(r))
}

// Mass is M(<r), the total times the regularised incomplete gamma function
// P(3/α, (2/α) x^α) (Retana-Montenegro et al. 2012).
func (h Einasto) Mass(r float64) float64 {
	return h.moment(3) * mathext.GammaIncReg(3/h.Alpha, h.depth(r))
}

// Projected returns Σ(R) and its mean inside R.
func (h Einasto) Projected(R float64) (surface, mean float64) {
	surface, excess := h.project(R)
	return surface, surface + excess
}

// shells holds the nodes of the trapezoid rule after the substitution
//
//	t = ln(1 + exp(τ − exp(−τ))),
//
// which goes to zero doubly exponentially on the left, as Takahasi & Mori 1974
// have it, and to equal steps of t on the right, where the density falls off.
var shells = func() (nodes []shell) {
	const step = 1.0 / 6
	for i := range 300 {
		tau := -3.625 + step*float64(i)
		u := math.Exp(tau - math.Exp(-tau))
		t := math.Log1p(u)
		half := math.Sinh(t / 2)
		nodes = append(nodes, shell{
			lnCosh: math.Log1p(2 * half * half),
			weight: step * u / (1 + u) * (1 + math.Exp(-tau)) * math.Cosh(t),
			fall:   math.Exp(-2 * t),
		})
	}
	return nodes
}()

// shell is one node: ln cosh t, the weight times cosh t, and e^(−2t).
type shell struct{ lnCosh, weight, fall float64 }

// project returns Σ and ΔΣ. With r = R cosh t they are
//
//	Σ  = 2R ∫₀^∞ ρ cosh t dt
//	ΔΣ = M(<R)/(πR²) − 2R ∫₀^∞ ρ cosh t e^(−2t) dt
//
// by quadrature good to 1e-13 of Σ, for neither has a closed form of elementary
// functions.
func (h Einasto) project(R float64) (surface, excess float64) {
	depth := h.depth(R)
	var outer float64
	for _, s := range shells {
		f := s.weight * math.Exp(2/h.Alpha-depth*math.Exp(h.Alpha*s.lnCosh))
		surface += f
		outer += f * s.fall
		if f < 1e-17*surface && s.lnCosh > 0 {
			break
		}
	}
	scale := 2 * R * h.RhoS
	return scale * surface, h.Mass(R)/(math.Pi*R*R) - scale*outer
}

// SurfaceDensity is Σ(R).
func (h Einasto) SurfaceDensity(R float64) float64 {
	surface, _ := h.project(R)
	return surface
}

// MeanSurfaceDensity is the mean of Σ inside R.
func (h Einasto) MeanSurfaceDensity(R float64) float64 {
	_, mean := h.Projected(R)
	return mean
}

// ExcessSurfaceDensity is ΔΣ(R).
func (h Einasto) ExcessSurfaceDensity(R float64) float64 {
	_, excess := h.project(R)
	return excess
}

// ProjectedMass is the mass in the cylinder of radius R.
func (h Einasto) ProjectedMass(R float64) float64 {
	return math.Pi * R * R * h.MeanSurfaceDensity(R)
}

// Potential is φ = −GM(<r)/r − 4πG ∫ρ r dr from r on, zero at infinity.
func (h Einasto) Potential(r float64) float64 {
	outer := h.moment(2) * mathext.GammaIncRegComp(2/h.Alpha, h.depth(r))
	return -constants.G * (h.Mass(r)/r + outer)
}

// EscapeSpeed is √(−2φ).
func (h Einasto) EscapeSpeed(r float64) float64 { return math.Sqrt(-2 * h.Potential(r)) }
