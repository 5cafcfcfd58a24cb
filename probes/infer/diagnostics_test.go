package infer

import (
	"encoding/json"
	"math"
	"math/rand/v2"
	"os"
	"testing"
)

func readJSON(t *testing.T, file string, into any) {
	t.Helper()
	data, err := os.ReadFile("testdata/" + file)
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(data, into); err != nil {
		t.Fatal(err)
	}
}

// testdata/chains.json was computed by a separate numpy and scipy script from the
// published formulae; both are double precision, and 1e-9 leaves room for the
// rounding of its Fourier transforms.
func TestChainDiagnostics(t *testing.T) {
	var file struct {
		Cases []struct {
			Name    string      `json:"name"`
			Chains  [][]float64 `json:"chains"`
			RHat    float64     `json:"r_hat"`
			BulkESS float64     `json:"bulk_ess"`
			TailESS float64     `json:"tail_ess"`
		} `json:"cases"`
	}
	readJSON(t, "chains.json", &file)
	if len(file.Cases) != 6 {
		t.Fatalf("%d cases", len(file.Cases))
	}
	for _, c := range file.Cases {
		for _, n := range []struct {
			name      string
			got, want float64
		}{{"split R̂", rHat(c.Chains), c.RHat}, {"bulk ESS", bulkESS(c.Chains), c.BulkESS}, {"tail ESS", tailESS(c.Chains), c.TailESS}} {
			if math.Abs(n.got/n.want-1) > 1e-9 {
				t.Errorf("%s: %s is %v, want %v", c.Name, n.name, n.got, n.want)
			}
		}
	}
}

func TestChainsThatStandStill(t *testing.T) {
	still := [][]float64{{1, 1, 1, 1, 1, 1, 1, 1, 1, 1}, {2, 2, 2, 2, 2, 2, 2, 2, 2, 2}}
	if r := rHat(still); !math.IsInf(r, 1) {
		t.Errorf("R̂ %g, want +Inf", r)
	}
	if n := bulkESS(still); n != 0 {
		t.Errorf("bulk ESS %g, want 0", n)
	}
}

// testdata/pareto.json: samples of scipy.stats.genpareto, with the estimates of a
// separate numpy script and, as a third opinion, the maximum likelihood of
// scipy.optimize.
func TestFitPareto(t *testing.T) {
	var file struct {
		Cases []struct {
			TrueShape float64   `json:"true_shape"`
			Excesses  []float64 `json:"excesses"`
			Shape     float64   `json:"shape"`
			Scale     float64   `json:"scale"`
			MLShape   float64   `json:"ml_shape"`
		} `json:"cases"`
	}
	readJSON(t, "pareto.json", &file)
	if len(file.Cases) != 4 {
		t.Fatalf("%d cases", len(file.Cases))
	}
	for _, c := range file.Cases {
		shape, scale := fitPareto(c.Excesses)
		if math.Abs(shape-c.Shape) > 1e-9 || math.Abs(scale/c.Scale-1) > 1e-9 {
			t.Errorf("true shape %g: shape %v scale %v, want %v %v", c.TrueShape, shape, scale, c.Shape, c.Scale)
		}
		// Without the pull towards ½ the estimator is not the maximum likelihood,
		// but both see the same 300 numbers: they differ by less than the error of
		// either, (1+k)/√300.
		unpulled := (shape*310 - 5) / 300
		if math.Abs(unpulled-c.MLShape) > (1+c.TrueShape)/math.Sqrt(300) {
			t.Errorf("true shape %g: shape %g, maximum likelihood %g", c.TrueShape, unpulled, c.MLShape)
		}
	}
}

// Weights with a known Pareto tail of shape k: the estimate is within its error,
// (1+k)/√tail with 3√n weights in the tail, and smoothing keeps the order.
func TestSmooth(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	const n = 10000
	for _, k := range []float64{0.2, 0.5, 0.7, 1} {
		lnW := make([]float64, n)
		for i := range lnW {
			lnW[i] = -k * math.Log(1-rng.Float64())
		}
		before := append([]float64(nil), lnW...)
		shape := smooth(lnW)
		if math.Abs(shape-k) > 4*(1+k)/math.Sqrt(3*math.Sqrt(n)) {
			t.Errorf("shape %.3f, want %g", shape, k)
		}
		most := math.Inf(-1)
		for _, l := range before {
			most = max(most, l)
		}
		for i := range lnW {
			if lnW[i] > most {
				t.Fatal("a smoothed weight exceeds the largest")
			}
			for j := i + 1; j < min(i+20, n); j++ {
				if before[i] < before[j] && lnW[i] > lnW[j] {
					t.Fatal("smoothing changed the order of the weights")
				}
			}
		}
	}
	alike := make([]float64, 100)
	if k := smooth(alike); !math.IsInf(k, -1) {
		t.Errorf("equal weights have tail shape %g, want −Inf", k)
	}
	none := []float64{math.Inf(-1), math.Inf(-1), math.Inf(-1)}
	if k := smooth(none); !math.IsInf(k, -1) {
		t.Errorf("no possible point: tail shape %g, want −Inf", k)
	}
}
