package dynamics

import (
	"fmt"
	"math"
)

// causticMembers keeps the galaxies between the caustics of the (R, v) diagram
// (Diaferio 1999; Serra & Diaferio 2013): those slower than the escape speed that
// the diagram shows at their radius. The level of the caustics is set by the
// galaxies that clipping leaves inside r_200.
func (f *field) causticMembers(group []candidate, window float64) ([]string, error) {
	if err := f.clipped(group, f.number("clip")); err != nil {
		return nil, err
	}
	sigma := scaleNamed("automatic", countMembers(group)).of(sorted(recentre(group)), nil)
	edge := 0.0
	var radius, velocities []float64
	var member []bool
	for _, c := range group {
		radius, velocities, member = append(radius, c.radius), append(velocities, c.velocity), append(member, c.member)
		edge = max(edge, c.radius)
	}
	d := newDiagram(radius, velocities, edge, 1.1*window, f.task.Cosmology.Params().HubbleConstant)
	mean, square := d.membersOf(member, nil, coreRadius(f.task, sigma), 0)
	a, ok := caustics(d, d.density, mean, square)
	if !ok {
		return nil, f.task.Errorf("%s: the galaxies' diagram has no caustics; take another way to find members", f.file)
	}
	reasons := make([]string, len(group))
	for k := range group {
		c := &group[k]
		c.core, c.limit = c.member, a.at(d, c.radius)
		c.member = math.Abs(c.velocity) < c.limit
		side := "between"
		if !c.member {
			side = "outside"
		}
		reasons[k] = fmt.Sprintf("%+.0f km/s at %.0f kpc, %s the caustics", c.velocity, c.radius, side)
	}
	if n := countMembers(group); n < fewest {
		return nil, f.task.Errorf("%s: only %d galaxies lie between the caustics; a dispersion needs at least %d", f.file, n, fewest)
	}
	f.note("members: %d galaxies between the caustics of the diagram of radius and velocity (Diaferio 1999)", countMembers(group))
	return reasons, nil
}
