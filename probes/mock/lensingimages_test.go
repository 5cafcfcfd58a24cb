package mock

import (
	"math"
	"math/rand/v2"
	"testing"
)

// All images of a family, before errors, map back to one source, to the 0.01
// arcsec that x = Δα cos δ is good to here.
func TestArcsMapBackToOneSource(t *testing.T) {
	truth := Truth{Redshift: 0.25, RA: 1, Dec: 0.2, HubbleConstant: 70, OmegaMatter: 0.3, M200: 1.2e15, C200: 7}
	a := Arcs{Redshifts: []float64{1.5, 3}, Ellipticity: [2]float64{0.08, -0.05}, Shear: [2]float64{0.02, 0.03}, Centre: [2]float64{6, -4}, Fewest: 3, FaintestFactor: 0.3}
	c := truth.Arcs(a, rand.New(rand.NewPCG(1, 2)))
	l := truth.lens()
	horizon := truth.horizon(l)
	s := truth.potential(a, l, horizon)
	var sources [2][][2]float64
	for i, k := range c.Source {
		// Close to the centre the plane and the sphere differ by 1e-8.
		x, y := (c.RA[i]-truth.RA)*math.Cos(c.Dec[i]), c.Dec[i]-truth.Dec
		far := l.distance(c.Redshift[i])
		sx, sy := s.source(x, y, (far-l.near)/far/((horizon-l.near)/horizon))
		sources[k] = append(sources[k], [2]float64{sx, sy})
	}
	for k, family := range sources {
		if len(family) < a.Fewest {
			t.Errorf("family %d has %d images", k, len(family))
		}
		for _, p := range family {
			if off := math.Hypot(p[0]-family[0][0], p[1]-family[0][1]); off > 0.02*math.Pi/180/3600 {
				t.Errorf("family %d: images map back %.3g rad apart", k, off)
			}
		}
	}
}
