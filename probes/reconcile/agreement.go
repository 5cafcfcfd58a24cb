package reconcile

import (
	"fmt"
	"math"
	"slices"

	"steelyard/probes/infer"
)

// Consistency says whether all estimates of independent data agree at a place.
type Consistency struct {
	At       string
	Of       []string // the estimates that entered
	Chi2     float64  // of ln M about the best common value, full covariance
	Dof      int      // number of estimates less one
	P        float64  // probability of contrasts less likely than none
	Sigma    float64  // two-sided equivalent of P
	Tail     bool     // a fitted tail was used
	Verdict  string
	Without  []float64 // sigma without each of Of; nil for two
	LnBayes  float64   // of one common mass against a mass for each
	Doubtful []string
}

// SeparatePrior says what prior the masses have where each estimate has its own.
const SeparatePrior = "each mass flat in ln M over a factor of 10⁴"

// lnPriorWidth is ln of the width of that prior in ln M.
var lnPriorWidth = math.Log(math.Log(1e4))

// agreement is the highest-density probability of the K−1 contrasts of ln M all
// being zero. For two estimates it is the pair's.
//
// With flat priors of width W in ln M, the evidence of one common mass over that
// of separate ones is W^(K−1) times the density of the contrasts at zero.
func agreement(place *Matched, m *Matching, pairs []*pair, limits [3]float64, stream infer.Stream) (Consistency, error) {
	c := Consistency{At: place.At.String(), Dof: len(m.Members) - 1, Doubtful: m.doubtful(m.Members...)}
	var ln [][]float64
	for _, k := range m.Members {
		c.Of, ln = append(c.Of, m.Compared[k].Name), append(ln, place.LnMass[k])
	}
	residual, common := parts(place, m.Members)
	best, err := BestLinear(jointMoments(ln, common))
	if err != nil {
		return c, fmt.Errorf("%s: %w", place.At, err)
	}
	c.Chi2 = best.Chi2
	if len(m.Members) == 2 {
		d := find(pairs, m.Members[0], m.Members[1]).density
		c.P, c.Tail = d.LessLikely(0)
		c.LnBayes = lnPriorWidth + d.log(0)
	} else {
		logs := logDensities(residual)
		d := newContrastDensity(logs, common)
		c.P, c.Tail = d.lessLikely(residual, common, effort, stream)
		c.LnBayes = float64(c.Dof)*lnPriorWidth + d.log(make([]float64, len(m.Members)))
		c.Without = withoutEach(m.Members, pairs, logs, residual, common, stream)
	}
	c.Sigma = Sigma(c.P)
	c.Verdict = Verdict(c.Sigma, limits)
	return c, nil
}

func find(pairs []*pair, a, b int) *pair {
	return pairs[slices.IndexFunc(pairs, func(p *pair) bool { return p.a == min(a, b) && p.b == max(a, b) })]
}

// withoutEach is the significance of the disagreement when each member in turn
// is left out.
func withoutEach(members []int, pairs []*pair, logs []*logDensity, residual, common [][]float64, stream infer.Stream) []float64 {
	out := make([]float64, len(members))
	for k := range members {
		rest := without(members, k)
		if len(rest) == 2 {
			p, _ := find(pairs, rest[0], rest[1]).density.LessLikely(0)
			out[k] = Sigma(p)
			continue
		}
		l, r, c := without(logs, k), without(residual, k), without(common, k)
		p, _ := newContrastDensity(l, c).lessLikely(r, c, effort/20, stream.Sub(fmt.Sprintf("without %d", k)))
		out[k] = Sigma(p)
	}
	return out
}

func without[T any](list []T, k int) []T { return slices.Delete(slices.Clone(list), k, k+1) }
