package lensing

import (
	"math"

	"gonum.org/v1/gonum/interp"

	"steelyard/probes/halo"
)

// projection tabulates the surface densities of a model whose shape is fixed
// and whose scale is one, for models that must be integrated along the line of
// sight: ln Σ and ln ΔΣ by cubic splines in ln R.
type projection struct {
	surface, excess interp.NaturalCubic
}

const projectionFrom, projectionTo, projectionStep = 1e-4, 1e4, 0.05 // of R/r_s, and of ln

func newProjection(unit halo.Model) *projection {
	n := int(math.Log(projectionTo/projectionFrom)/projectionStep) + 1
	x, surface, excess := make([]float64, n), make([]float64, n), make([]float64, n)
	last := n
	for i := range x {
		x[i] = math.Log(projectionFrom) + float64(i)*projectionStep
		s, mean := halo.Projected(unit, math.Exp(x[i]))
		surface[i], excess[i] = math.Log(s), math.Log(mean-s)
		if !(s > 1e-280) { // nothing is left of an exponential cut-off
			last = i
			break
		}
	}
	p := new(projection)
	if p.surface.Fit(x[:last], surface[:last]) != nil || p.excess.Fit(x[:last], excess[:last]) != nil {
		panic("lensing: a table of surface densities that does not rise in radius")
	}
	return p
}

// projected is a model whose surface densities come from a table.
type projected struct {
	halo.Model
	table     *projection
	scale     float64 // kpc, of the table's radii
	amplitude float64 // Msun/kpc², of its surface densities
}

// Projected returns Σ(R) and its mean inside R, to 1e-6.
func (p projected) Projected(R float64) (surface, mean float64) {
	x := math.Log(R / p.scale)
	surface = p.amplitude * math.Exp(p.table.surface.Predict(x))
	return surface, surface + p.amplitude*math.Exp(p.table.excess.Predict(x))
}
