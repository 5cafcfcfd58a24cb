// Package cosmology computes distances, times and densities of a homogeneous
// expanding universe (Friedmann, Lemaître, Robertson & Walker) of matter, dark
// energy, curvature and, optionally, photons and massless neutrinos.
//
// Start with New, which refuses a background that cannot be ours, and ask the
// *Cosmology it returns. Lengths are in kpc (physical unless a name says
// comoving), masses in Msun, times in Gyr, rates in km/s/Mpc. Redshifts must
// not be negative: every function of a distance or a time is NaN there.
// Distances and times are good to better than 1e-11 of their value; New
// verifies this for the background at hand.
//
// Formulae: Hogg 1999 (astro-ph/9905116) for the distances; Chevallier &
// Polarski 2001 and Linder 2003 for dark energy whose pressure changes,
// w(a) = w0 + wa (1 − a).
package cosmology

import (
	"fmt"
	"math"
	"sync"
)

// Params states a background. The zero value of a field means zero, except
// that New fills nothing in: callers state every number.
//
// The curvature is what is left over, 1 − Ω_m − Ω_Λ − Ω_r. Radiation counts:
// with a CMB temperature a flat background needs Ω_Λ = 1 − Ω_m − Ω_r, which
// Flat fills in.
type Params struct {
	HubbleConstant float64 // km/s/Mpc
	OmegaMatter    float64
	OmegaLambda    float64 // or dark energy with W0, Wa
	W0, Wa         float64 // −1, 0 for a cosmological constant
	CMBTemperature float64 // K; 0 switches photons and massless neutrinos off
}

// Flat returns p with the dark energy that makes space flat,
// Ω_Λ = 1 − Ω_m − Ω_r.
func (p Params) Flat() Params {
	p.OmegaLambda = 1 - p.OmegaMatter - p.OmegaRadiation()
	return p
}

// Cosmology is one background, ready to use and safe for concurrent use.
type Cosmology struct {
	p Params

	radiation float64 // Ω_r today
	curvature float64 // Ω_k today
	root      float64 // √|Ω_k|
	hubble    float64 // c/H0 in kpc
	constant  bool    // dark energy is a cosmological constant

	past   integrals
	growth struct {
		once  sync.Once
		table growthTable
	}
}

// New checks the parameters and prepares a background. It is an error when a
// parameter is not finite or has an impossible sign, when there was no big
// bang, when the past expansion comes so close to a halt that distances cannot
// be had to the promised accuracy, and when a closed space is seen as far as
// its antipode.
func New(p Params) (*Cosmology, error) {
	if err := p.check(); err != nil {
		return nil, err
	}
	c := &Cosmology{
		p:         p,
		radiation: p.OmegaRadiation(),
		hubble:    1e3 * speedOfLight / p.HubbleConstant,
		constant:  p.W0 == -1 && p.Wa == 0,
	}
	c.curvature = 1 - p.OmegaMatter - p.OmegaLambda - c.radiation
	if math.Abs(c.curvature) < flatEnough {
		c.curvature = 0
	}
	c.root = math.Sqrt(math.Abs(c.curvature))
	if err := c.tabulate(); err != nil {
		return nil, err
	}
	if c.curvature < 0 && c.root*c.past.comoving[panels] >= math.Pi {
		return nil, fmt.Errorf("cosmology: omega_matter = %g with omega_lambda = %g closes space within our horizon, so that distances are ambiguous; lower one of them", p.OmegaMatter, p.OmegaLambda)
	}
	return c, nil
}

// flatEnough is the curvature taken for rounding of a flat background: it
// moves no distance by more than 1e-13.
const flatEnough = 1e-14

// check refuses numbers that make no sense by themselves.
func (p Params) check() error {
	for _, f := range []struct {
		name  string
		value float64
	}{
		{"hubble_constant", p.HubbleConstant},
		{"omega_matter", p.OmegaMatter},
		{"omega_lambda", p.OmegaLambda},
		{"w0", p.W0},
		{"wa", p.Wa},
		{"cmb_temperature", p.CMBTemperature},
	} {
		if math.IsNaN(f.value) || math.IsInf(f.value, 0) {
			return fmt.Errorf("cosmology: %s = %g is not a finite number", f.name, f.value)
		}
	}
	switch {
	case p.HubbleConstant < 1 || p.HubbleConstant > 1000:
		return fmt.Errorf("cosmology: hubble_constant = %g km/s/Mpc lies outside 1 to 1000; 70 km/s/Mpc is common", p.HubbleConstant)
	case p.OmegaMatter <= 0:
		return fmt.Errorf("cosmology: omega_matter = %g must be above zero", p.OmegaMatter)
	case p.CMBTemperature < 0 || p.CMBTemperature > 10:
		return fmt.Errorf("cosmology: cmb_temperature = %g K lies outside 0 to 10; 2.7255 K is measured, 0 leaves radiation out", p.CMBTemperature)
	case p.OmegaLambda != 0 && p.W0+p.Wa >= 0:
		return fmt.Errorf("cosmology: w0 + wa = %g: dark energy would never have been thinner than matter; w0 = -1 and wa = 0 are a cosmological constant", p.W0+p.Wa)
	}
	return nil
}

// Params returns what the background was made from.
func (c *Cosmology) Params() Params { return c.p }
