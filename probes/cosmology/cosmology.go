// Package cosmology computes distances, times and densities of a homogeneous
// expanding universe.
package cosmology

// Params states a background. The zero value of a field means zero, except
// that New fills nothing in: callers state every number.
type Params struct {
	HubbleConstant float64 // km/s/Mpc
	OmegaMatter    float64
	OmegaLambda    float64 // or dark energy with W0, Wa
	W0, Wa         float64 // −1, 0 for a cosmological constant
	CMBTemperature float64 // K; 0 switches photons and massless neutrinos off
}

// Cosmology is one background, ready to use and safe for concurrent use.
type Cosmology struct{ p Params }

// New checks the parameters and prepares a background.
func New(p Params) (*Cosmology, error) { return &Cosmology{p}, nil }

// Params returns what the background was made from.
func (c *Cosmology) Params() Params { return c.p }

// E is H(z)/H0.
func (c *Cosmology) E(z float64) float64 { panic("cosmology: being written") }

// H is the expansion rate in km/s/Mpc.
func (c *Cosmology) H(z float64) float64 { panic("cosmology: being written") }

// AngularDiameter is D_A in physical kpc.
func (c *Cosmology) AngularDiameter(z float64) float64 { panic("cosmology: being written") }

// AngularDiameterBetween is D_A from z1 to z2 in physical kpc, negative when z2 < z1.
func (c *Cosmology) AngularDiameterBetween(z1, z2 float64) float64 {
	panic("cosmology: being written")
}

// CriticalDensity is ρ_crit(z) in Msun/kpc³.
func (c *Cosmology) CriticalDensity(z float64) float64 { panic("cosmology: being written") }

// OmegaMatter is Ω_m(z).
func (c *Cosmology) OmegaMatter(z float64) float64 { panic("cosmology: being written") }

// VirialOverdensity is Δ_vir relative to critical (Bryan & Norman 1998), an
// error outside flat ΛCDM.
func (c *Cosmology) VirialOverdensity(z float64) (float64, error) { panic("cosmology: being written") }

// SigmaCritical is the critical surface density in Msun/kpc², +Inf for a source
// that is not behind the lens.
func (c *Cosmology) SigmaCritical(lens, source float64) float64 { panic("cosmology: being written") }

// Efficiency is β = D_ls/D_s, 0 for a source that is not behind the lens.
func (c *Cosmology) Efficiency(lens, source float64) float64 { panic("cosmology: being written") }

// EfficiencyInfinity is β for a source at infinite redshift.
func (c *Cosmology) EfficiencyInfinity(lens float64) float64 { panic("cosmology: being written") }
