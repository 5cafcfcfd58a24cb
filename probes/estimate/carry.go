package estimate

import (
	"math"

	"steelyard/probes/halo"
)

// Anchor is where an estimate that yields one mass knows it: inside a fixed
// radius, or inside the radius of a mean density.
type Anchor struct {
	Radius    float64 // kpc; 0 when Threshold holds
	Threshold float64 // mean density in Msun/kpc³
	Projected bool    // the mass is that of the cylinder of Radius, with an infinite line of sight
}

// Carry returns the NFW halo that has the mass (Msun) at the anchor, its
// concentration c_200c following c at theta. An error when no halo between 1e9
// and 1e18 Msun does.
//
// One mass does not fix a halo's shape: the shape is the concentration's
// assumption, and belongs to the error away from the anchor.
func (t *Task) Carry(mass float64, at Anchor, c Concentration, theta []float64) (halo.NFW, error) {
	threshold, err := halo.Definition{Delta: 200, Of: "critical"}.Threshold(t.Cosmology, t.Object.Redshift)
	if err != nil {
		return halo.NFW{}, err
	}
	build := func(lnM200 float64) halo.NFW {
		m200 := math.Exp(lnM200)
		return halo.NewNFW(m200, c.Of(theta, m200), threshold)
	}
	excess := func(lnM200 float64) float64 {
		m, err := anchored(build(lnM200), at)
		if err != nil {
			return math.Inf(-1)
		}
		return math.Log(m / mass)
	}
	lnM200, ok := rise(excess, math.Log(1e9), math.Log(1e18), math.Log(mass))
	if !ok {
		return halo.NFW{}, t.Errorf("no NFW halo between 1e9 and 1e18 Msun has a mass of %.3g Msun at the stated radius", mass)
	}
	return build(lnM200), nil
}

func anchored(h halo.NFW, at Anchor) (float64, error) {
	switch {
	case at.Radius > 0 && at.Projected:
		return h.ProjectedMass(at.Radius), nil
	case at.Radius > 0:
		return h.Mass(at.Radius), nil
	}
	r, err := halo.RadiusAt(h, at.Threshold)
	if err != nil {
		return 0, err
	}
	return h.Mass(r), nil
}

// rise finds the root of a rising function between lo and hi by secant steps
// kept inside a shrinking bracket, to 1e-12 in x.
func rise(f func(float64) float64, lo, hi, start float64) (float64, bool) {
	if f(lo) > 0 || f(hi) < 0 {
		return 0, false
	}
	x := min(max(start, lo), hi)
	for range 200 {
		fx := f(x)
		if fx == 0 || hi-lo < 1e-12 {
			return x, true
		}
		if fx < 0 {
			lo = x
		} else {
			hi = x
		}
		// The functions solved here rise with a slope near one, so a step of −f
		// lands close; the bracket catches it when it does not.
		next := x - fx
		if !(next > lo && next < hi) {
			next = (lo + hi) / 2
		}
		if math.Abs(next-x) < 1e-13*max(1, math.Abs(x)) {
			return next, true
		}
		x = next
	}
	return x, false
}
