package lensing

import (
	"encoding/json"
	"math"
	"os"
	"testing"

	"steelyard/probes/cosmology"
)

// structureReference holds the figures of testdata/lensing/structure.json, which says
// how they were computed apart from this package.
type structureReference struct {
	Params struct {
		H0          float64
		OmegaMatter float64 `json:"omega_matter"`
		OmegaBaryon float64 `json:"omega_baryon"`
		Sigma8      float64 `json:"sigma8"`
		NS          float64 `json:"n_s"`
	}
	Transfer       [][2]float64
	Power          [][4]float64
	Convergence    [][2]float64
	Edges          []float64 `json:"edges_arcmin"`
	Covariance     [][]float64
	SourceRedshift float64 `json:"source_redshift"`
}

func readStructure(t testing.TB) (*structureReference, *spectrum) {
	t.Helper()
	data, err := os.ReadFile("../../testdata/lensing/structure.json")
	if err != nil {
		t.Fatal(err)
	}
	r := new(structureReference)
	if err := json.Unmarshal(data, r); err != nil {
		t.Fatal(err)
	}
	p := r.Params
	c, err := cosmology.New(cosmology.Params{HubbleConstant: p.H0, OmegaMatter: p.OmegaMatter, OmegaLambda: 1 - p.OmegaMatter, W0: -1})
	if err != nil {
		t.Fatal(err)
	}
	s, err := newSpectrum(c, fluctuations{p.Sigma8, p.NS, p.OmegaBaryon})
	if err != nil {
		t.Fatal(err)
	}
	return r, s
}

func TestTransfer(t *testing.T) {
	r, s := readStructure(t)
	f := newTransfer(r.Params.OmegaMatter*s.h*s.h, r.Params.OmegaBaryon*s.h*s.h)
	for _, row := range r.Transfer {
		near(t, "T", f.at(row[0]), row[1], 1e-12) // rounding
	}
	// With hardly any baryons the fit becomes that of cold dark matter alone,
	// L/(L + C q²) with C = 14.2 + 386/(1 + 69.9 q^1.08): its equations 19 and 20
	// at α = β = 1.
	dark := newTransfer(0.147, 1e-7)
	for _, k := range []float64{1e-3, 0.03, 0.2, 2} {
		q := k / (13.41 * dark.equality)
		l := math.Log(math.E + 1.8*q)
		near(t, "T of dark matter", dark.at(k), l/(l+(14.2+386/(1+69.9*math.Pow(q, 1.08)))*q*q), 1e-4)
	}
}

func TestPower(t *testing.T) {
	r, s := readStructure(t)
	near(t, "σ8", s.topHat(8/s.h), r.Params.Sigma8, 1e-12)
	linear := func(k, z float64) float64 { return math.Pow(s.background.GrowthFactor(z), 2) * s.today(k) }
	for _, row := range r.Power {
		near(t, "linear power", linear(row[0], row[1]), row[2], 1e-5) // steps of the normalising sums
		near(t, "power", s.power(row[0], row[1]), row[3], 1e-4)       // and of the variance's
	}
	// On the largest scales nothing is non-linear.
	near(t, "power at k = 0.001", s.power(1e-3, 1), linear(1e-3, 1), 2e-3)
}

func TestShearCovariance(t *testing.T) {
	r, s := readStructure(t)
	c, err := s.convergence(r.SourceRedshift)
	if err != nil {
		t.Fatal(err)
	}
	for _, row := range r.Convergence {
		near(t, "P_κ", c.power(row[0]), row[1], 1e-3) // 48 planes against 240
	}
	var inner, outer []float64
	const arcmin = math.Pi / 180 / 60
	for i := range r.Covariance {
		inner, outer = append(inner, r.Edges[i]*arcmin), append(outer, r.Edges[i+1]*arcmin)
	}
	got := c.shearCovariance(inner, outer)
	for i := range r.Covariance {
		for j := range r.Covariance {
			// 2% of a step in l and in the table of P_κ.
			near(t, "covariance", got[4*i+j], r.Covariance[i][j], 3e-3)
		}
	}
}

// TestMeanJ2 compares the mean of J₂ over annuli with a sum.
func TestMeanJ2(t *testing.T) {
	for _, x := range []struct{ l, a, b float64 }{{1, 0, 0.01}, {10, 0.001, 0.002}, {1000, 0.001, 0.002}, {3000, 0.001, 0.0013}, {2e4, 0.001, 0.0013}, {50, 0.003, 0.003}, {5000, 0.002, 0.00200001}} {
		const n = 4000
		sum, total := 0.0, 0.0
		for i := range n {
			theta := x.a + (x.b-x.a)*(float64(i)+0.5)/n
			sum += math.Jn(2, x.l*theta) * theta
			total += theta
		}
		want := sum / total
		if got := meanJ2(x.l, x.a, x.b); math.Abs(got-want) > 1e-6*max(math.Abs(want), 1e-3) {
			t.Errorf("mean of J2 at l = %g over %g–%g is %.9g, want %.9g", x.l, x.a, x.b, got, want)
		}
	}
}

func TestRefusedSpectra(t *testing.T) {
	_, s := readStructure(t)
	for _, p := range []fluctuations{{}, {0.8, 0.96, 0.4}, {0.8, 0, 0.05}, {-1, 1, 0.05}, {0.8, 0.96, 0}} {
		if _, err := newSpectrum(s.background, p); err == nil {
			t.Errorf("%+v: accepted", p)
		}
	}
	for _, z := range []float64{0, -1, math.NaN(), 2000} {
		if _, err := s.convergence(z); err == nil {
			t.Errorf("sources at %g: accepted", z)
		}
	}
}

func BenchmarkStructure(b *testing.B) {
	r, s := readStructure(b)
	var inner, outer []float64
	for i := range 10 {
		inner = append(inner, 3e-4*math.Pow(1.3, float64(i)))
		outer = append(outer, 3e-4*math.Pow(1.3, float64(i+1)))
	}
	for b.Loop() {
		fresh, err := newSpectrum(s.background, fluctuations{r.Params.Sigma8, r.Params.NS, r.Params.OmegaBaryon})
		if err != nil {
			b.Fatal(err)
		}
		c, err := fresh.convergence(1)
		if err != nil {
			b.Fatal(err)
		}
		c.shearCovariance(inner, outer)
	}
}
