package lensing

import (
	"math"

	"steelyard/probes/estimate"
	"steelyard/probes/prior"
)

// offset is the distance on the sky, in kpc, between the centre of the bins
// and that of the halo. One object has one such distance: it is drawn, and not
// averaged over as for a stack.
type offset struct {
	distance estimate.Ref
	rayleigh float64 // scale of its Rayleigh distribution; 0 when its prior is its own
	reach    float64 // upper limit of the flat prior that the Rayleigh density then weighs
}

// newOffset adds the setting `miscentring`.
func newOffset(t *estimate.Task, ps *estimate.Parameters) (offset, error) {
	v := t.Settings["miscentring"]
	if !v.Prior.IsExact() || v.Prior.A == 0 {
		return offset{distance: ps.Assume(t.Settings, "miscentring")}, nil
	}
	o := offset{rayleigh: v.Prior.A, reach: 6 * v.Prior.A} // beyond it lie 2e-8 of the distribution
	flat, err := prior.Uniform(0, o.reach)
	if err != nil {
		return o, t.Errorf("miscentring: %w", err)
	}
	o.distance = ps.Draw("miscentring", "kpc", flat)
	return o, nil
}

// lnDensity is what the Rayleigh distribution adds to the flat prior,
//
//	ln [d/σ² exp(−d²/2σ²)] − ln (1/reach).
func (o offset) lnDensity(theta []float64) float64 {
	if o.rayleigh == 0 {
		return 0
	}
	x := o.distance.Of(theta) / o.rayleigh
	return math.Log(x*o.reach/o.rayleigh) - x*x/2
}

// turned is one direction about a wrong centre: the cosine of its angle from
// the halo.
var turned = func() (cosines [24]float64) {
	for i := range cosines {
		cosines[i] = math.Cos(math.Pi * (float64(i) + 0.5) / float64(len(cosines)))
	}
	return cosines
}()

// aroundOffset averages over the circle of radius R about a centre at distance
// d from the halo the tangential component about that centre of the shear g(r)
// of the halo:
//
//	⟨g_t⟩ = (1/π) ∫₀^π g(r) cos 2ψ dφ,   r² = R² + d² − 2Rd cos φ
//
// with ψ the angle at the galaxy between the two centres. For γ this is the
// shear of the azimuthally averaged Σ of Johnston et al. 2007; here it holds
// for the reduced shear.
func aroundOffset(R, d float64, g func(r float64) float64) float64 {
	if d == 0 {
		return g(R)
	}
	d = math.Abs(d)
	sum := 0.0
	for _, c := range turned {
		r2 := R*R + d*d - 2*R*d*c
		along := R - d*c
		sum += g(math.Sqrt(r2)) * (2*along*along/r2 - 1)
	}
	return sum / float64(len(turned))
}
