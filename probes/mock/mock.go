// Package mock invents data with a known truth, by routes the estimators do not
// use: what an estimator has in closed form is summed here by brute force, so
// that a mistake in one does not hide in the other. It shares with them only
// the table of constants.
package mock

import (
	"math"

	"steelyard/probes/constants"
)

// Truth is the object whose data are invented: an NFW halo (Navarro, Frenk &
// White 1997) in a flat universe of matter and a cosmological constant.
type Truth struct {
	Name           string
	Redshift       float64
	RA, Dec        float64 // radians
	HubbleConstant float64 // km/s/Mpc
	OmegaMatter    float64
	M200           float64 // Msun, inside 200 times the critical density
	C200           float64 // r_200 / r_s
}

// expansion is H(z) in km/s/Mpc.
func (t Truth) expansion(z float64) float64 {
	return t.HubbleConstant * math.Sqrt(t.OmegaMatter*math.Pow(1+z, 3)+1-t.OmegaMatter)
}

// CriticalDensity is 3H²/(8πG) at the object, in Msun/kpc³.
func (t Truth) CriticalDensity() float64 {
	perKpc := t.expansion(t.Redshift) / 1000 // km/s/kpc
	return 3 * perKpc * perKpc / (8 * math.Pi * constants.G)
}

// ComovingDistance is the sum of c dz/H(z) by the midpoint rule in 4000 steps,
// in kpc: good to a few parts in 1e8 for z < 5.
func (t Truth) ComovingDistance(z float64) float64 {
	const steps = 4000
	sum := 0.0
	for i := range steps {
		sum += 1 / t.expansion(z*(float64(i)+0.5)/steps)
	}
	return sum * z / steps * constants.SpeedOfLight * 1000
}

// AngularDiameter is the angular-diameter distance to redshift z in kpc.
func (t Truth) AngularDiameter(z float64) float64 { return t.ComovingDistance(z) / (1 + z) }

// R200 is the radius in kpc inside which the mean density is 200 times critical.
func (t Truth) R200() float64 {
	return math.Cbrt(3 * t.M200 / (4 * math.Pi * 200 * t.CriticalDensity()))
}

// Density is the density in Msun/kpc³ at r kpc. It prepares the halo anew; use
// Halo for many radii.
func (t Truth) Density(r float64) float64 { return t.Halo().Density(r) }

// Halo is a Truth made ready: its normalisation found by summing shells.
type Halo struct {
	Rs   float64 // kpc
	norm float64 // Msun/kpc³
}

// Halo normalises the density so that the shells inside R200 add up to M200.
func (t Truth) Halo() *Halo {
	h := &Halo{Rs: t.R200() / t.C200, norm: 1}
	h.norm = t.M200 / h.Mass(t.R200())
	return h
}

// Density is the density in Msun/kpc³ at r kpc.
func (h *Halo) Density(r float64) float64 {
	x := r / h.Rs
	return h.norm / (x * (1 + x) * (1 + x))
}

// Mass adds up spherical shells of equal width in r^(1/2) out to r kpc, by the
// midpoint rule with Richardson's correction: good to 1e-9.
func (h *Halo) Mass(r float64) float64 {
	coarse, fine := h.shells(r, 2000), h.shells(r, 4000)
	return fine + (fine-coarse)/3
}

func (h *Halo) shells(r float64, n int) float64 {
	sum := 0.0
	for i := range n {
		u := (float64(i) + 0.5) / float64(n) // s = r u², ds = 2 r u du
		s := r * u * u
		sum += s * s * h.Density(s) * 2 * r * u
	}
	return 4 * math.Pi * sum / float64(n)
}
