package lensing

import (
	"math"

	"steelyard/probes/halo"
)

// reducedShear is the mean reduced shear of sources with mean efficiency beta
// and mean square efficiency beta2, to second order in κ (Seitz & Schneider
// 1997, A&A 318, 687):
//
//	⟨g⟩ = ⟨β⟩ γ / (1 − (⟨β²⟩/⟨β⟩) κ)
//
// gamma and kappa are for a source at infinity. It is 0 when no source is
// behind the lens.
func reducedShear(gamma, kappa, beta, beta2 float64) float64 {
	if beta == 0 {
		return 0
	}
	return beta * gamma / (1 - beta2/beta*kappa)
}

// ellipticity is the mean ε of randomly oriented sources at reduced shear g: g
// itself outside the critical curve and 1/g inside (Seitz & Schneider 1997).
func ellipticity(g float64) float64 {
	if math.Abs(g) > 1 {
		return 1 / g
	}
	return g
}

// signal is what lies between a halo and the shear that is measured.
type signal struct {
	critical   float64 // Σ_cr of a source at infinity, Msun/kpc²
	bins       []Bin
	elongation float64 // multiplies the projected mass
	distance   float64 // multiplies β
	offset     float64 // distance of the bins' centre from the halo's, kpc
	response   float64 // multiplies the shear: (1+m)(1−f)
}

// predict fills out with the shear expected in each bin: the reduced shear at
// the bin's nodes, averaged over the bin.
func (s *signal) predict(m halo.Model, out []float64) {
	scale := s.elongation / s.critical
	for i := range s.bins {
		b := &s.bins[i]
		beta, beta2 := s.distance*b.Beta, s.distance*s.distance*b.Beta2
		at := func(R float64) float64 {
			surface, mean := halo.Projected(m, R)
			return ellipticity(reducedShear(scale*(mean-surface), scale*surface, beta, beta2))
		}
		sum := 0.0
		for _, n := range b.Nodes {
			sum += n.Share * aroundOffset(n.Radius, s.offset, at)
		}
		out[i] = s.response * sum
	}
}
