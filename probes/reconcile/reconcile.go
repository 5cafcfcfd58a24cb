// Package reconcile brings mass estimates of one object to the same radius,
// makes them share the systematic errors they name in common, and says whether
// they agree, by how many sigma, and in which words.
//
// The order of the work: MatchAll joins the estimates (Transport) and reads them
// at each place, Compare states the tensions and the agreement of all. Everything is
// done on draws of ln M; nothing is propagated by hand.
package reconcile

import (
	"slices"

	"steelyard/probes/infer"
)

// Version is raised when equal estimates would give other numbers.
const Version = 1

// Result is what the comparison found.
type Result struct {
	Tensions    []Tension
	Consistency []Consistency
	Warnings    []string
}

// Compare states the tension of every pair and the agreement of all at every
// place. Of estimates made from the same data only the first named enters the
// agreement.
func Compare(m *Matching, limits [3]float64, stream infer.Stream) (*Result, error) {
	r := &Result{Warnings: m.Warnings}
	members := independent(m.Blocks)
	var pairs []*pair
	for i := range m.Places {
		place, here := &m.Places[i], len(pairs)
		for a := range m.Names {
			for b := a + 1; b < len(m.Names); b++ {
				p, err := difference(place, a, b)
				if err != nil {
					return nil, err
				}
				pairs = append(pairs, p)
				r.Tensions = append(r.Tensions, p.tension(place, m))
			}
		}
		if len(members) > 1 {
			c, err := agreement(place, members, pairs[here:], limits, stream.Sub(place.At.String()))
			if err != nil {
				return nil, err
			}
			r.Consistency = append(r.Consistency, c)
		}
	}
	familyWise(r.Tensions, pairs)
	if len(members) < len(m.Names) {
		r.Warnings = append(r.Warnings, "estimates made from the same data as one named before them show a spread of methods, and do not enter the agreement of all")
	}
	return r, nil
}

// independent lists the estimates that do not share their data with one named
// before them.
func independent(blocks []string) []int {
	var members []int
	for k, block := range blocks {
		if slices.Index(blocks, block) == k {
			members = append(members, k)
		}
	}
	return members
}
