package reconcile

import (
	"fmt"
	"math"
)

// Tension is the difference of two estimates at one place.
type Tension struct {
	At      string
	A, B    string
	Ratio   Interval // M_a/M_b
	Own     bool     // each at its own radius rather than matched
	Sigma   float64  // two-sided, with the sign of ln ratio
	P       float64  // probability of a difference less likely than none
	Tail    bool     // a fitted tail was used
	PFamily float64  // probability that any pair at any place printed lies as far out by chance
	// SameData marks two estimates of one block: their difference is a spread of
	// methods, not a disagreement of independent data.
	SameData bool
}

// pair is the distribution of one difference, kept for the family-wise p.
type pair struct {
	a, b    int
	density *density
	delta   []float64 // joint draws
}

// difference returns the distribution of Δ = ln M_a − ln M_b over joint draws:
// the residuals of both and the difference of what the shared nuisances carry
// are independent of each other, and every combination of their draws counts.
func difference(m *Matched, a, b int) (*pair, error) {
	residual, common := parts(m, []int{a, b})
	delta := make([]float64, len(residual[0]))
	for i := range delta {
		delta[i] = m.LnMass[a][i] - m.LnMass[b][i]
	}
	between := minus(common[0], common[1])
	if _, sd := meanSD(delta); !(sd > 0) {
		return nil, fmt.Errorf("%s and %s do not vary at %s, so their difference has no error", m.Marks[a].Name, m.Marks[b].Name, m.At)
	}
	return &pair{a, b, convolve(residual[0], minus(nil, residual[1]), between), delta}, nil
}

// minus is a − b, either of which may be nil for zeros; nil when both are.
func minus(a, b []float64) []float64 {
	out := make([]float64, max(len(a), len(b)))
	copy(out, a)
	for i := range b {
		out[i] -= b[i]
	}
	if len(out) == 0 {
		return nil
	}
	return out
}

func (p *pair) tension(place *Matched, m *Matching) Tension {
	ln := interval(p.delta)
	t := Tension{
		At: place.At.String(), A: m.Names[p.a], B: m.Names[p.b], Own: place.Own,
		Ratio:    Interval{Median: math.Exp(ln.Median), Lo: math.Exp(ln.Lo), Hi: math.Exp(ln.Hi)},
		SameData: m.Blocks[p.a] == m.Blocks[p.b],
	}
	t.P, t.Tail = p.density.LessLikely(0)
	t.Sigma = math.Copysign(Sigma(t.P), ln.Median)
	return t
}

// familyWise fills in, for every tension of independent data, the probability
// that the largest of all printed significances would reach it if the estimates
// agreed: the share of joint draws in which some difference lies as far out in
// its own distribution. Where fewer than thirty draws do, Bonferroni's bound.
func familyWise(tensions []Tension, pairs []*pair) {
	var members []int
	for k, t := range tensions {
		if !t.SameData {
			members = append(members, k)
		}
	}
	if len(members) == 0 {
		return
	}
	n := len(pairs[0].delta)
	smallest := make([]float64, n)
	for i := range smallest {
		smallest[i] = 1
		for _, k := range members {
			p, _ := pairs[k].density.LessLikely(pairs[k].delta[i])
			smallest[i] = min(smallest[i], p)
		}
	}
	for _, k := range members {
		count := 0
		for _, p := range smallest {
			if p <= tensions[k].P {
				count++
			}
		}
		if count >= 30 {
			tensions[k].PFamily = float64(count) / float64(n)
		} else {
			tensions[k].PFamily = min(1, float64(len(members))*tensions[k].P)
		}
	}
}
