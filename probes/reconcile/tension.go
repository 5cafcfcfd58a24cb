package reconcile

import (
	"fmt"
	"math"
	"slices"
)

// Tension is the difference of two estimates of independent data at one place.
type Tension struct {
	At      string
	A, B    string
	Ratio   Interval // M_a/M_b
	Own     bool     // each at its own radius rather than matched
	Sigma   float64  // two-sided, with the sign of ln ratio
	P       float64  // probability of a difference less likely than none
	Tail    bool     // a fitted tail was used
	PFamily float64  // probability that any pair at any place printed lies as far out by chance
	// LnMean and LnSD are the mean and standard deviation of ln ratio.
	LnMean, LnSD float64
	// RadiusLn is by how much ln ratio changes when the matched radius moves by
	// its own error; 0 where the radius has none.
	RadiusLn float64
	Doubtful []string // "lensing.shapes.nfw is poorly fitted"
}

// Spread is the difference of two estimates made from the same data. Their
// errors are not independent, so it has no significance.
type Spread struct {
	At    string
	A, B  string
	Ratio float64 // of the medians, M_a/M_b
}

func spreadOf(place *Matched, a, b int) Spread {
	x, y := place.Marks[a], place.Marks[b]
	return Spread{At: place.At.String(), A: x.Name, B: y.Name, Ratio: x.Mass.Median / y.Mass.Median}
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
	delta := minus(m.LnMass[a], m.LnMass[b])
	if _, sd := meanSD(delta); !(sd > 0) {
		return nil, fmt.Errorf("%s and %s do not vary at %s, so their difference has no error", m.Marks[a].Name, m.Marks[b].Name, m.At)
	}
	return &pair{a, b, convolve(residual[0], minus(nil, residual[1]), minus(common[0], common[1])), delta}, nil
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

// parts separates ln M into what the shared nuisances carry and the rest.
func parts(m *Matched, members []int) (residual, common [][]float64) {
	for _, k := range members {
		r := m.LnMass[k]
		if m.Common[k] != nil {
			r = minus(r, m.Common[k])
		}
		residual, common = append(residual, r), append(common, m.Common[k])
	}
	return residual, common
}

func (p *pair) tension(place *Matched, m *Matching) Tension {
	ln := p.density.quantiles(0.16, 0.5, 0.84)
	t := Tension{
		At: place.At.String(), A: m.Compared[p.a].Name, B: m.Compared[p.b].Name, Own: place.Own,
		Ratio:    Interval{Lo: math.Exp(ln[0]), Median: math.Exp(ln[1]), Hi: math.Exp(ln[2])},
		RadiusLn: math.Abs(place.Marks[p.a].Slope - place.Marks[p.b].Slope),
		Doubtful: m.doubtful(p.a, p.b),
	}
	t.LnMean, t.LnSD = meanSD(p.delta)
	t.P, t.Tail = p.density.LessLikely(0)
	t.Sigma = math.Copysign(Sigma(t.P), ln[1])
	return t
}

// doubtful says which of the estimates should not be believed.
func (m *Matching) doubtful(members ...int) []string {
	var out []string
	for _, k := range members {
		c := m.Compared[k]
		if c.NotConverged {
			out = append(out, c.Name+" did not converge")
		}
		if c.PoorlyFitted {
			out = append(out, c.Name+" is poorly fitted")
		}
	}
	return out
}

// familyWise fills in, for every tension, the probability that the largest of
// all printed significances would reach it if the estimates agreed: the share of
// joint draws in which some difference lies as far out in its own distribution.
// Where fewer than thirty draws do, Bonferroni's bound.
func familyWise(tensions []Tension, pairs []*pair) {
	if len(pairs) == 0 {
		return
	}
	n := len(pairs[0].delta)
	smallest := make([]float64, n)
	for i := range smallest {
		smallest[i] = 1
	}
	for _, p := range pairs {
		table := p.density.tabulate(p.delta)
		for i, x := range p.delta {
			smallest[i] = min(smallest[i], table.at(x))
		}
	}
	slices.Sort(smallest)
	for k := range tensions {
		count, _ := slices.BinarySearch(smallest, math.Nextafter(tensions[k].P, 2))
		if count >= reliable {
			tensions[k].PFamily = float64(count) / float64(n)
		} else {
			tensions[k].PFamily = min(1, float64(len(tensions))*tensions[k].P)
		}
	}
}
