package reconcile

import (
	"encoding/json"
	"math"
	"os"
	"testing"

	"gonum.org/v1/gonum/mat"
)

type combinations struct {
	Linear []struct {
		Name        string      `json:"name"`
		X           []float64   `json:"x"`
		Sigma       []float64   `json:"sigma"`
		Correlation [][]float64 `json:"correlation"`
		Mean        float64     `json:"mean"`
		SD          float64     `json:"sigma_mean"`
		Weights     []float64   `json:"weights"`
		Chi2        float64     `json:"chi2"`
	} `json:"linear"`
	Two []struct {
		X       []float64 `json:"x"`
		Sigma   []float64 `json:"sigma"`
		Rho     float64   `json:"rho"`
		Weights []float64 `json:"weights"`
		Mean    float64   `json:"mean"`
		SD      float64   `json:"sigma_mean"`
		Chi2    float64   `json:"chi2"`
	} `json:"two"`
	Random []struct {
		Name       string    `json:"name"`
		Y          []float64 `json:"y"`
		Sigma      []float64 `json:"sigma"`
		Q          float64   `json:"q"`
		FixedMean  float64   `json:"fixed_mean"`
		FixedError float64   `json:"fixed_error"`
		Tau2       float64   `json:"tau2"`
		Mean       float64   `json:"mean"`
		Error      float64   `json:"error"`
	} `json:"random"`
}

// readCombinations reads testdata/statistics/combination.json, which names its
// source.
func readCombinations(t *testing.T) combinations {
	t.Helper()
	b, err := os.ReadFile("../../testdata/statistics/combination.json")
	if err != nil {
		t.Fatal(err)
	}
	var c combinations
	if err := json.Unmarshal(b, &c); err != nil {
		t.Fatal(err)
	}
	return c
}

// covariance of the given errors; a nil correlation is none.
func covariance(sigma []float64, correlation [][]float64) *mat.SymDense {
	c := mat.NewSymDense(len(sigma), nil)
	for a := range sigma {
		c.SetSym(a, a, sigma[a]*sigma[a])
		for b := a + 1; b < len(sigma) && correlation != nil; b++ {
			c.SetSym(a, b, sigma[a]*sigma[b]*correlation[a][b])
		}
	}
	return c
}

// The figures carry 16 digits; 1e-10 is what their source asks of a test.
func near(t *testing.T, what string, got, want float64) {
	t.Helper()
	if math.Abs(got-want) > 1e-10*math.Max(math.Abs(want), 1) {
		t.Errorf("%s = %.14g, want %.14g", what, got, want)
	}
}

func TestBestLinearAgainstReference(t *testing.T) {
	c := readCombinations(t)
	if len(c.Linear) < 5 || len(c.Two) < 7 {
		t.Fatalf("only %d and %d rows were read", len(c.Linear), len(c.Two))
	}
	for _, row := range c.Linear {
		got, err := BestLinear(row.X, covariance(row.Sigma, row.Correlation))
		if err != nil {
			t.Fatalf("%s: %v", row.Name, err)
		}
		near(t, row.Name+": mean", got.Mean, row.Mean)
		near(t, row.Name+": error", got.SD, row.SD)
		near(t, row.Name+": χ²/reference", got.Chi2/row.Chi2, 1)
		for k := range row.Weights {
			near(t, row.Name+": weight", got.Weights[k], row.Weights[k])
		}
	}
	negative := 0
	for _, row := range c.Two {
		got, err := BestLinear(row.X, covariance(row.Sigma, [][]float64{{1, row.Rho}, {row.Rho, 1}}))
		if err != nil {
			t.Fatalf("ρ = %g: %v", row.Rho, err)
		}
		near(t, "mean", got.Mean, row.Mean)
		near(t, "error", got.SD, row.SD)
		near(t, "χ²", got.Chi2, row.Chi2)
		for k := range row.Weights {
			near(t, "weight", got.Weights[k], row.Weights[k])
		}
		if got.Weights[1] < -1e-12 {
			negative++
		}
	}
	// ρ = 0.7, 0.9 and 0.99 exceed σ1/σ2 = 0.5.
	if negative != 3 {
		t.Errorf("%d negative weights, want 3", negative)
	}
}

func TestRandomEffectsAgainstReference(t *testing.T) {
	rows := readCombinations(t).Random
	if len(rows) < 3 {
		t.Fatalf("only %d rows were read", len(rows))
	}
	for _, row := range rows {
		c := covariance(row.Sigma, nil)
		fixed, err := BestLinear(row.Y, c)
		if err != nil {
			t.Fatal(err)
		}
		near(t, row.Name+": fixed mean", fixed.Mean, row.FixedMean)
		near(t, row.Name+": fixed error", fixed.SD, row.FixedError)
		near(t, row.Name+": Q", fixed.Chi2, row.Q)
		random, err := RandomEffects(row.Y, c)
		if err != nil {
			t.Fatal(err)
		}
		near(t, row.Name+": τ²", random.Scatter*random.Scatter, row.Tau2)
		near(t, row.Name+": mean", random.Mean, row.Mean)
		near(t, row.Name+": error", random.SD, row.Error)
	}
}

// A scatter common to all makes no difference to their differences: with equal
// errors σ and correlation ρ, χ² is Σ(x−x̄)²/(σ²(1−ρ)), and Paule and Mandel's
// τ² = s² − σ²(1−ρ), s² being the sample variance.
func TestRandomEffectsOfCorrelatedMeasurements(t *testing.T) {
	x := []float64{0.1, -0.4, 0.7, 0.2}
	const sigma, rho = 0.2, 0.6
	c := mat.NewSymDense(4, nil)
	for a := range 4 {
		for b := a; b < 4; b++ {
			c.SetSym(a, b, sigma*sigma*rho)
		}
		c.SetSym(a, a, sigma*sigma)
	}
	got, err := RandomEffects(x, c)
	if err != nil {
		t.Fatal(err)
	}
	mean, sd := meanSD(x)
	near(t, "mean", got.Mean, mean)
	near(t, "τ²", got.Scatter*got.Scatter, sd*sd*4/3-sigma*sigma*(1-rho))
}

func TestCombinationRefusesWhatHasNoError(t *testing.T) {
	if _, err := BestLinear([]float64{1, 2}, covariance([]float64{0.1, 0}, nil)); err == nil {
		t.Error("a measurement without an error was combined")
	}
	if _, err := BestLinear([]float64{1, 2}, covariance([]float64{0.1, 0.2}, [][]float64{{1, 1}, {1, 1}})); err == nil {
		t.Error("two measurements that move as one were combined")
	}
}
