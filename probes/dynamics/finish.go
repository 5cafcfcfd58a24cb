package dynamics

import (
	"fmt"
	"sort"
	"strings"

	"steelyard/probes/estimate"
	"steelyard/probes/infer"
)

// finish lays the masses on the grid and adds what can be said of the galaxies
// once there is a mass: how many lie inside its radii, and how their dispersion
// runs.
func finish(t *estimate.Task, s *sample, f estimate.Fit) (*infer.Draws, error) {
	d, err := t.Finish(f)
	if err != nil || s == nil {
		return d, err
	}
	d.Checks = append(d.Checks, s.membersInside(t, d), s.dispersionProfile())
	return d, nil
}

// membersInside counts the galaxies inside the radii at which masses are read.
func (s *sample) membersInside(t *estimate.Task, d *infer.Draws) infer.Check {
	c := infer.Check{Name: "members inside radii", PValue: -1, Passed: true}
	var counts []string
	for _, delta := range []float64{2500, 500, 200} {
		var radii []float64
		for i := range d.N {
			if r, ok := d.RadiusAt(i, delta*t.Cosmology.CriticalDensity(t.Object.Redshift)); ok {
				radii = append(radii, r)
			}
		}
		if len(radii) == 0 {
			continue
		}
		radius, n := infer.Percentiles(radii, 50)[0], 0
		for _, g := range s.galaxies {
			if g.Radius <= radius {
				n++
			}
		}
		c.Statistic = float64(n)
		counts = append(counts, fmt.Sprintf("%d inside R_%.0f = %.0f kpc", n, delta, radius))
	}
	c.Note = strings.Join(counts, ", ")
	return c
}

// dispersionProfile gives the dispersion of the inner, middle and outer third of
// the galaxies; the statistic is the outer over the inner one.
func (s *sample) dispersionProfile() infer.Check {
	byRadius := append([]Galaxy(nil), s.galaxies...)
	sort.SliceStable(byRadius, func(a, b int) bool { return byRadius[a].Radius < byRadius[b].Radius })
	n := len(byRadius)
	var sigma []float64
	var words []string
	for third := range 3 {
		part := byRadius[third*n/3 : (third+1)*n/3]
		v := make([]float64, len(part))
		for i, g := range part {
			v[i] = g.Velocity
		}
		sigma = append(sigma, scaleNamed(s.scale.name, len(v)).of(sorted(v), nil))
		words = append(words, fmt.Sprintf("%.0f km/s to %.0f kpc", sigma[third], part[len(part)-1].Radius))
	}
	return infer.Check{Name: "dispersion profile", Statistic: sigma[2] / sigma[0], PValue: -1, Passed: true,
		Note: "thirds of the galaxies: " + strings.Join(words, ", ")}
}
