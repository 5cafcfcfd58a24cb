package mock

import (
	"encoding/json"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"os"
	"slices"
	"sort"
	"testing"
)

// TestShearOfLens compares the projected lens with the shear of an NFW halo
// from its closed form, figures of testdata/lensing/shear.json.
func TestShearOfLens(t *testing.T) {
	data, err := os.ReadFile("../../testdata/lensing/shear.json")
	if err != nil {
		t.Fatal(err)
	}
	var ref struct {
		Halo        struct{ Redshift, M200c, C200c float64 }
		SinglePlane []struct {
			R, Zs float64
			G     float64 `json:"g_t"`
		} `json:"single_plane"`
	}
	if err := json.Unmarshal(data, &ref); err != nil {
		t.Fatal(err)
	}
	truth := Truth{Redshift: ref.Halo.Redshift, HubbleConstant: 70, OmegaMatter: 0.3, M200: ref.Halo.M200c, C200: ref.Halo.C200c}
	l := truth.lens()
	for _, row := range ref.SinglePlane {
		// Sums and interpolation err by 1e-5, the difference of Σ and its mean by
		// a few times more.
		if g := l.reducedShear(row.R, row.Zs, 1); math.Abs(g/row.G-1) > 1e-4 {
			t.Errorf("g(%g kpc, z = %g) = %.8g, want %.8g", row.R, row.Zs, g, row.G)
		}
	}
	if len(ref.SinglePlane) == 0 {
		t.Fatal("no figures")
	}
	for _, z := range []float64{0, 0.1, 0.25} {
		if l.reducedShear(300, z, 1) != 0 {
			t.Errorf("a source at %g in front of the lens at 0.25 is sheared", z)
		}
	}
}

// TestSheared checks that the mean ellipticity of a ring of equal sources is g,
// or 1/g* inside the critical curve (Seitz & Schneider 1997).
func TestSheared(t *testing.T) {
	for _, g := range []complex128{0, complex(0.1, -0.2), complex(-0.9, 0.1), complex(1.5, 1), complex(0, -3)} {
		var sum complex128
		const n = 720
		for i := range n {
			e := sheared(cmplx.Rect(0.4, 2*math.Pi*float64(i)/n), g)
			if cmplx.Abs(e) >= 1 {
				t.Fatalf("g = %v makes an ellipticity of %g", g, cmplx.Abs(e))
			}
			sum += e
		}
		want := g
		if cmplx.Abs(g) > 1 {
			want = 1 / cmplx.Conj(g)
		}
		if cmplx.Abs(sum/n-want) > 1e-12 { // rounding
			t.Errorf("g = %v: mean %v, want %v", g, sum/n, want)
		}
	}
}

func TestShapes(t *testing.T) {
	truth := Truth{Redshift: 0.25, RA: 0, Dec: 1.2, HubbleConstant: 70, OmegaMatter: 0.3, M200: 8e14, C200: 4.5}
	s := Shapes{Galaxies: 20000, Field: 0.005, RedshiftScale: 0.6, Quiet: 0.2, Noisy: 0.3}
	c := truth.Shapes(s, rand.New(rand.NewPCG(1, 2)))
	again := truth.Shapes(s, rand.New(rand.NewPCG(1, 2)))
	if !slices.Equal(c.E1, again.E1) || !slices.Equal(c.RA, again.RA) || !slices.Equal(c.Redshift, again.Redshift) {
		t.Error("the same stream makes another catalogue")
	}
	n := float64(s.Galaxies)
	var inner, weight float64
	for i := range c.RA {
		// Angle from the centre by the cosine rule.
		angle := math.Acos(math.Sin(c.Dec[i])*math.Sin(truth.Dec) + math.Cos(c.Dec[i])*math.Cos(truth.Dec)*math.Cos(c.RA[i]-truth.RA))
		if angle > s.Field*(1+1e-9) || c.RA[i] < 0 || c.RA[i] >= 2*math.Pi {
			t.Fatalf("galaxy %d stands at %g, %g", i, c.RA[i], c.Dec[i])
		}
		if angle < s.Field/2 {
			inner++
		}
		weight += c.Weight[i] / n
	}
	// A quarter of an even field, with four times the binomial scatter.
	if math.Abs(inner/n-0.25) > 4*math.Sqrt(0.25*0.75/n) {
		t.Errorf("%.4f of the galaxies lie within half the field", inner/n)
	}
	// The mean of 1/σ² for σ evenly between 0.2 and 0.3 is 1/(0.2·0.3); it
	// scatters by 5 a galaxy.
	if math.Abs(weight-1/0.06) > 4*5/math.Sqrt(n) {
		t.Errorf("mean weight %.4f", weight)
	}
	z := append([]float64(nil), c.Redshift...)
	sort.Float64s(z)
	// (z/z0)^1.5 follows a gamma distribution of shape 2, of median 1.6783.
	if median := 0.6 * math.Pow(1.6783, 2.0/3); math.Abs(z[len(z)/2]/median-1) > 0.02 {
		t.Errorf("median redshift %.4f, want %.4f", z[len(z)/2], median)
	}

	// Diluted all the way there is no shear; mirrored, e1 stays and e2 flips.
	s.Quiet, s.Noisy, s.Galaxies = 0, 0, 200
	plain := truth.Shapes(s, rand.New(rand.NewPCG(1, 2)))
	s.West = true
	west := truth.Shapes(s, rand.New(rand.NewPCG(1, 2)))
	s.Dilution = 1
	none := truth.Shapes(s, rand.New(rand.NewPCG(1, 2)))
	for i := range plain.E1 {
		if west.E1[i] != plain.E1[i] || west.E2[i] != -plain.E2[i] {
			t.Fatalf("galaxy %d: %g, %g mirrored is %g, %g", i, plain.E1[i], plain.E2[i], west.E1[i], west.E2[i])
		}
		if none.E1[i] != 0 || none.E2[i] != 0 {
			t.Fatalf("galaxy %d is sheared although all are diluted", i)
		}
	}
}
