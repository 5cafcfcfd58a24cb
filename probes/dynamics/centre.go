package dynamics

import (
	"fmt"
	"math"
	"sort"

	"steelyard/probes/catalogue"
	"steelyard/probes/estimate"
)

// centre is where radii are counted from, in rad, and how it was chosen.
type centre struct {
	ra, dec float64
	how     string
}

// findCentre takes the object's centre or finds one among the galaxies within
// 2000 km/s of its redshift: the brightest of them, or the one that is nearest to
// its tenth neighbour.
func findCentre(t *estimate.Task, table *catalogue.Table, choice string) (centre, error) {
	if choice == "given" {
		if !t.Object.HasCentre {
			return centre{}, t.Errorf("the object has no centre, so the galaxies have no distance from it: add `centre = sky(\"…\", \"…\")` to the object, or `centre = \"densest\"` or \"brightest\" to the block members")
		}
		return centre{t.Object.RA, t.Object.Dec, "the object's"}, nil
	}
	ra, dec, z := table.Values("ra"), table.Values("dec"), table.Values("redshift")
	var near []int
	for i := range ra {
		if math.Abs(velocity(z[i], t.Object.Redshift)) < 2000 {
			near = append(near, i)
		}
	}
	if len(near) < fewest {
		return centre{}, t.Errorf("%s: %d galaxies within 2000 km/s of redshift %g are too few to find a centre among", table.File, len(near), t.Object.Redshift)
	}
	if choice == "brightest" {
		magnitude := table.Values("magnitude")
		if magnitude == nil {
			return centre{}, t.Errorf("%s: centre = \"brightest\" needs a column `magnitude`", table.File)
		}
		best := near[0]
		for _, i := range near {
			if magnitude[i] < magnitude[best] {
				best = i
			}
		}
		return centre{ra[best], dec[best], fmt.Sprintf("the brightest galaxy within 2000 km/s, row %d", table.Rows[best])}, nil
	}
	best, tightest := near[0], math.Inf(1)
	for _, i := range near {
		distances := make([]float64, 0, len(near))
		for _, j := range near {
			east, north := offset(ra[i], dec[i], ra[j], dec[j])
			distances = append(distances, math.Hypot(east, north))
		}
		sort.Float64s(distances)
		// distances[0] is the galaxy itself.
		if d := distances[min(10, len(near)-1)]; d < tightest {
			best, tightest = i, d
		}
	}
	return centre{ra[best], dec[best], fmt.Sprintf("the densest point, about row %d, with ten neighbours inside %.2g arcmin", table.Rows[best], tightest*180*60/math.Pi)}, nil
}

func (c centre) note() string {
	return fmt.Sprintf("centre: %s, at RA %.5f, Dec %+.5f deg", c.how, c.ra*180/math.Pi, c.dec*180/math.Pi)
}
