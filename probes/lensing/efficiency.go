package lensing

import (
	"math"

	"steelyard/probes/cosmology"
)

// efficiencies tabulates β(z) of sources behind a lens, relative to a source at
// infinity, for catalogues too long to integrate a distance for every row.
type efficiencies struct {
	lens   float64
	low, h float64 // first node and step in ln z, where β bends alike for all lenses
	values []float64
	c      *cosmology.Cosmology
	limit  float64 // β of a source at infinity
}

// newEfficiencies prepares a table from the lens to redshift far.
func newEfficiencies(c *cosmology.Cosmology, lens, far float64) *efficiencies {
	const steps = 512
	e := &efficiencies{lens: lens, low: math.Log(lens), c: c, limit: c.EfficiencyInfinity(lens)}
	if far <= lens {
		return e
	}
	e.h = (math.Log(far) - e.low) / steps
	e.values = make([]float64, steps+1)
	for i := 1; i <= steps; i++ {
		e.values[i] = e.exact(math.Exp(e.low + float64(i)*e.h))
	}
	return e
}

// exact is β without the table.
func (e *efficiencies) exact(z float64) float64 {
	if z <= e.lens {
		return 0
	}
	return e.c.Efficiency(e.lens, z) / e.limit
}

// at interpolates β with a cubic through the four nearest nodes, to 1e-9. It is
// 0 up to the redshift of the lens.
func (e *efficiencies) at(z float64) float64 {
	if z <= e.lens {
		return 0
	}
	u := (math.Log(z) - e.low) / e.h
	i := min(max(int(u)-1, 0), len(e.values)-4)
	t := u - float64(i)
	v := e.values[i : i+4]
	a, b, c, d := t, t-1, t-2, t-3
	return -v[0]*b*c*d/6 + v[1]*a*c*d/2 - v[2]*a*b*d/2 + v[3]*a*b*c/6
}

// mean returns ⟨β⟩ and ⟨β²⟩ of a distribution; nil weights are equal.
func (e *efficiencies) mean(redshifts, weights []float64) (beta, beta2 float64) {
	total := 0.0
	for i, z := range redshifts {
		w := 1.0
		if weights != nil {
			w = weights[i]
		}
		b := e.exact(z)
		beta += w * b
		beta2 += w * b * b
		total += w
	}
	return beta / total, beta2 / total
}
