package dynamics

import (
	"context"
	"fmt"

	"steelyard/probes/estimate"
	"steelyard/probes/infer"
)

// checks tests whether the members look like one system in equilibrium. A test
// fails below p = 0.01.
func (s *sample) checks(ctx context.Context, t *estimate.Task) ([]infer.Check, []string, error) {
	const fails = 0.01
	var list []infer.Check
	var failed []string
	add := func(name string, statistic, p float64, note string) {
		c := infer.Check{Name: name, Statistic: statistic, PValue: p, Passed: p >= fails}
		if !c.Passed {
			c.Note = note
			failed = append(failed, name)
		}
		list = append(list, c)
	}
	a2, p := AndersonDarling(s.velocities)
	add("normal velocities (Anderson-Darling)", a2, p, "the velocities are not normally distributed")
	g1, p := Skewness(s.velocities)
	add("skew of velocities", g1, p, "the two sides of the mean velocity differ")
	delta, p, err := s.substructure(ctx, t)
	if err != nil {
		return nil, nil, err
	}
	add("substructure (Dressler-Shectman)", delta, p, "groups of neighbours move differently from the whole")
	ratio, p, split := twoClumps(s.velocities)
	if split == "" {
		// Two normals of which one is a small wing, or both overlap, are a matter
		// for the test of normality.
		p = 1
	}
	add("one clump (two-normal mixture)", ratio, p, "two normals fit the velocities much better than one")
	n := float64(len(s.galaxies) + s.rejected)
	list = append(list,
		infer.Check{Name: "members", Statistic: float64(len(s.galaxies)), PValue: -1, Passed: true,
			Note: fmt.Sprintf("%d galaxies inside %.0f kpc", len(s.galaxies), s.farthest())},
		infer.Check{Name: "fraction rejected", Statistic: float64(s.rejected) / n, PValue: -1, Passed: true,
			Note: fmt.Sprintf("%d of %.0f galaxies of the velocity window at these radii are not members", s.rejected, n)})
	var warnings []string
	if p < fails {
		warnings = append(warnings, split)
	}
	if len(failed) > 0 {
		warnings = append(warnings, fmt.Sprintf("the galaxies do not look like one system in equilibrium (%s): a mass from their motions should not be trusted here", joined(failed)))
	}
	return list, warnings, nil
}

func joined(words []string) string {
	out := words[0]
	for _, w := range words[1:] {
		out += ", " + w
	}
	return out
}
