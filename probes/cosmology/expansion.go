package cosmology

import (
	"fmt"
	"math"

	"steelyard/probes/constants"
)

const speedOfLight = constants.SpeedOfLight

// neutrinoSpecies is the effective number of massless neutrinos, 3.046
// (Mangano et al. 2005).
const neutrinoSpecies = 3.046

// OmegaRadiation is the density parameter today of photons and of massless
// neutrinos,
//
//	Ω_γ = 4 σ_SB T⁴/(c³ ρ_crit),   Ω_ν = (7/8) (4/11)^(4/3) N_eff Ω_γ = 0.2271 N_eff Ω_γ,
//
// with N_eff = 3.046 (Komatsu et al. 2011). Zero without a CMB temperature.
func (p Params) OmegaRadiation() float64 {
	hubble := p.HubbleConstant / constants.SecondsPerHubble // 1/s
	critical := 3 * hubble * hubble / (8 * math.Pi * constants.NewtonSI)
	light := 1e3 * speedOfLight // m/s
	t2 := p.CMBTemperature * p.CMBTemperature
	photons := 4 * constants.StefanBoltzmannSI * t2 * t2 / (light * light * light) / critical
	return photons * (1 + 0.875*math.Pow(4.0/11, 4.0/3)*neutrinoSpecies)
}

// OmegaCurvature is Ω_k today; positive in an open universe.
func (c *Cosmology) OmegaCurvature() float64 { return c.curvature }

// darkEnergy is the density of dark energy at scale factor a in units of
// today's critical density, times a⁴.
func (c *Cosmology) darkEnergy(a float64) float64 {
	if c.constant {
		return c.p.OmegaLambda * a * a * a * a
	}
	if c.p.OmegaLambda == 0 {
		return 0
	}
	return c.p.OmegaLambda * math.Exp((1-3*(c.p.W0+c.p.Wa))*math.Log(a)-3*c.p.Wa*(1-a))
}

// e2 is E²(z).
func (c *Cosmology) e2(z float64) float64 {
	u := 1 + z
	u2 := u * u
	return u2*(u2*c.radiation+u*c.p.OmegaMatter+c.curvature) + u2*u2*c.darkEnergy(1/u)
}

// E is H(z)/H0,
//
//	E² = Ω_r (1+z)⁴ + Ω_m (1+z)³ + Ω_k (1+z)² + Ω_Λ (1+z)^(3(1+w0+wa)) exp(−3 wa z/(1+z)).
func (c *Cosmology) E(z float64) float64 { return math.Sqrt(c.e2(z)) }

// H is the expansion rate in km/s/Mpc.
func (c *Cosmology) H(z float64) float64 { return c.p.HubbleConstant * c.E(z) }

// CriticalDensity is ρ_crit(z) = 3H²/(8πG) in Msun/kpc³.
func (c *Cosmology) CriticalDensity(z float64) float64 {
	h := c.p.HubbleConstant / 1e3 // km/s/kpc
	return 3 * h * h / (8 * math.Pi * constants.G) * c.e2(z)
}

// MeanDensity is the mean density of matter in Msun/kpc³, in a physical volume.
func (c *Cosmology) MeanDensity(z float64) float64 {
	u := 1 + z
	return c.p.OmegaMatter * u * u * u * c.CriticalDensity(0)
}

// OmegaMatter is Ω_m(z).
func (c *Cosmology) OmegaMatter(z float64) float64 {
	u := 1 + z
	return c.p.OmegaMatter * u * u * u / c.e2(z)
}

// VirialOverdensity is Δ_vir relative to critical,
//
//	Δ_vir = 18π² + 82 x − 39 x²,   x = Ω_m(z) − 1
//
// (Bryan & Norman 1998, fitted for Ω_m(z) of 0.1 to 1; coefficients from memory). It is an error
// outside flat ΛCDM, for which alone the formula holds.
func (c *Cosmology) VirialOverdensity(z float64) (float64, error) {
	if c.curvature != 0 || (c.p.OmegaLambda != 0 && !c.constant) {
		return 0, fmt.Errorf("cosmology: the virial overdensity of Bryan & Norman 1998 holds in a flat background with a cosmological constant only, and here omega_curvature = %.3g, w0 = %g, wa = %g; state the overdensity as a number", c.curvature, c.p.W0, c.p.Wa)
	}
	x := c.OmegaMatter(z) - 1
	return 18*math.Pi*math.Pi + x*(82-39*x), nil
}
