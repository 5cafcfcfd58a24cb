package dynamics

import (
	"math"
	"testing"

	"steelyard/probes/halo"
)

// The dispersions of an NFW halo with five kinds of orbits, against figures
// computed with mpmath at 30 digits.
func TestLineOfSightDispersions(t *testing.T) {
	var file struct {
		Halo     map[string]float64
		SigmaLOS []map[string]float64 `json:"sigma_los"`
		SigmaR   []map[string]float64 `json:"sigma_r"`
	}
	published(t, "jeans.json", &file)
	rs, c := file.Halo["rs"], file.Halo["c"]
	h := halo.NewNFW(file.Halo["M200c"], c, file.Halo["M200c"]/(4*math.Pi/3*math.Pow(rs*c, 3)))
	for _, o := range []struct {
		name   string
		orbits orbits
	}{
		{"beta-0.5", constantOrbits(-0.5)}, {"beta0", constantOrbits(0)}, {"beta0.3", constantOrbits(0.3)},
		{"beta0.5", constantOrbits(0.5)}, {"OM_ra=rs", radialOutside(rs)},
	} {
		coarse := newSphere(10, 4000)
		coarse.solve(h.Density, h.SurfaceDensity, h.Mass, o.orbits)
		for _, row := range file.SigmaLOS {
			R, want := row["R_kpc"], row["sigma_los_"+o.name]
			at := newSphere(R, 2*R)
			at.solve(h.Density, h.SurfaceDensity, h.Mass, o.orbits)
			// What is left at a grid point is the end of the line of sight.
			near(t, "σ_los at a grid point, "+o.name, math.Sqrt(at.variance[0]), want, 1e-5)
			// Between grid points, cubics over steps of 0.2 in ln R.
			near(t, "σ_los between, "+o.name, math.Sqrt(coarse.at(math.Log(R))), want, 1e-4)
		}
	}
}

// at reads σ_los² at ln R by four-point interpolation; inside the first radius it
// is that of the first.
func (s *sphere) at(lnR float64) float64 {
	return table{s.lnFrom, 2 * gridStep, s.variance}.at(lnR)
}

func TestRisingOrbits(t *testing.T) {
	// With its scale radius at infinity or zero, or β_∞ = 0, the rising orbits are
	// those of a constant β.
	h := halo.NFW{RhoS: 1e6, Rs: 300}
	for _, c := range []struct {
		rising risingOrbits
		same   constantOrbits
	}{{risingOrbits{0.4, 1e-6}, 0.4}, {risingOrbits{0.4, 1e9}, 0}, {risingOrbits{0, 300}, 0}} {
		a, b := newSphere(10, 3000), newSphere(10, 3000)
		a.solve(h.Density, h.SurfaceDensity, h.Mass, c.rising)
		b.solve(h.Density, h.SurfaceDensity, h.Mass, c.same)
		for _, R := range []float64{10, 100, 1000, 3000} {
			near(t, "σ_los", a.at(math.Log(R)), b.at(math.Log(R)), 1e-6)
		}
	}
}

func BenchmarkSphere(b *testing.B) {
	h := halo.NFW{RhoS: 1e6, Rs: 300}
	s := newSphere(10, 3000)
	projectionWeights()
	for b.Loop() {
		s.solve(h.Density, h.SurfaceDensity, h.Mass, risingOrbits{0.3, 300})
	}
}
