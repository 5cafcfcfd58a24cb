// Package mock invents data with a known truth, by routes the estimators do not
// use: what an estimator has in closed form is integrated here by brute force,
// so that a mistake in one does not hide in the other.
package mock

import (
	"math"
	"math/rand/v2"
)

// Truth is the object whose data are invented: an NFW halo in a flat universe.
type Truth struct {
	Name           string
	Redshift       float64
	RA, Dec        float64 // radians
	HubbleConstant float64 // km/s/Mpc
	OmegaMatter    float64 // flat
	M200           float64 // Msun, 200 times critical
	C200           float64
}

// Density returns the NFW density in Msun/kpc³ at r kpc, its normalisation
// found by summing shells rather than from the closed form of the mass.
func (t Truth) Density(r float64) float64 { panic("mock: being written") }

var _ = rand.NewPCG
var _ = math.Pi
