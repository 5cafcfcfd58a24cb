// Package reconcile brings mass estimates of one object to the same radius,
// makes them share the systematic errors they name in common, and says whether
// they agree, by how many sigma, and in which words.
//
// The order of the work: Share says which draws of the estimates belong
// together, MatchAll reads them at each place, Compare states the tensions, the
// agreement of all and the combined mass. Levers asks of a disagreement what
// would have to be different. Everything is done on draws of ln M; nothing is
// propagated by hand.
package reconcile

import (
	"steelyard/probes/infer"
)

// Version is raised when equal estimates would give other numbers.
const Version = 4

// Result is what the comparison found.
type Result struct {
	Tensions    []Tension // of pairs of independent data
	Profiles    []ProfileTension
	Spreads     []Spread // between estimates made from the same data
	Consistency []Consistency
	Combined    []Combined
	Warnings    []string
}

// Compare states the tension of every pair, the agreement of all and the
// combined mass at every place. Estimates made from the same data show a spread
// of methods; only one of them enters the agreement and the combination.
func Compare(m *Matching, limits [3]float64, stream infer.Stream) (*Result, error) {
	r := &Result{Warnings: m.Warnings}
	var pairs []*pair
	for i := range m.Places {
		place := &m.Places[i]
		here, err := m.pairs(place, r)
		if err != nil {
			return nil, err
		}
		pairs = append(pairs, here...)
		if len(m.Members) < 2 {
			continue
		}
		c, err := agreement(place, m, here, limits, stream.Sub(place.At.String()))
		if err != nil {
			return nil, err
		}
		r.Consistency = append(r.Consistency, c)
		combined, err := combine(place, m, stream)
		if err != nil {
			return nil, err
		}
		r.Combined = append(r.Combined, combined)
	}
	familyWise(r.Tensions, pairs)
	r.Profiles = profileTensions(m)
	return r, nil
}

// pairs compares every two estimates at one place.
func (m *Matching) pairs(place *Matched, r *Result) ([]*pair, error) {
	var out []*pair
	for a, x := range m.Compared {
		for b := a + 1; b < len(m.Compared); b++ {
			if y := m.Compared[b]; x.Block == y.Block {
				r.Spreads = append(r.Spreads, spreadOf(place, a, b))
				continue
			}
			p, err := difference(place, a, b)
			if err != nil {
				return nil, err
			}
			out = append(out, p)
			r.Tensions = append(r.Tensions, p.tension(place, m))
		}
	}
	return out, nil
}
