package lensing

import (
	"math"
	"math/rand/v2"
	"testing"
)

// TestComponents holds the components to the reference, in a field so small
// that the sky is flat.
func TestComponents(t *testing.T) {
	about := newCentre(0, 0)
	for _, r := range readReference(t).Components {
		const small = 1e-9 // radians a unit; the curvature is of order 1e-13
		p := about.locate(r.X*small, r.Y*small)
		tangential, cross := p.components(r.E1, r.E2)
		if math.Abs(tangential-r.Tangential) > 1e-10 || math.Abs(cross-r.Cross) > 1e-10 {
			t.Errorf("at (%g, %g): %.12g and %.12g, want %.12g and %.12g", r.X, r.Y, tangential, cross, r.Tangential, r.Cross)
		}
	}
}

// TestAnywhereOnTheSky measures invented shapes without noise about centres at
// right ascension zero, near and at the poles. The catalogue is made with unit
// vectors, so that nothing is shared with locate. Without noise every galaxy's
// cross component is zero.
func TestAnywhereOnTheSky(t *testing.T) {
	quiet := deep
	quiet.Galaxies, quiet.Quiet, quiet.Noisy = 300, 0, 0
	for _, at := range [][2]float64{{3, 0.1}, {0, 0.7}, {1e-4, -1.2}, {2 * math.Pi, 0}, {1, math.Pi/2 - 1e-3}, {2, -math.Pi/2 + 1e-5}, {4, math.Pi / 2}} {
		truth := curlew
		truth.RA, truth.Dec = at[0], at[1]
		c := truth.Shapes(quiet, rand.New(rand.NewPCG(3, 4)))
		about := newCentre(at[0], at[1])
		var sum float64
		for i := range c.RA {
			p := about.locate(c.RA[i], c.Dec[i])
			tangential, cross := p.components(c.E1[i], c.E2[i])
			// Rounding of positions, over the closest galaxies' separation.
			if math.Abs(cross) > 1e-9 || tangential < 0 {
				t.Fatalf("centre %v: galaxy %d at %g rad has tangential %g, cross %g", at, i, p.angle, tangential, cross)
			}
			sum += tangential
		}
		if sum == 0 {
			t.Errorf("centre %v: no shear at all", at)
		}
	}
}
