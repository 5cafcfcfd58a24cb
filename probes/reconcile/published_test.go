package reconcile

import (
	"encoding/json"
	"math"
	"math/rand/v2"
	"os"
	"testing"
)

// A published comparison that states its significance is found again. The paper
// counts in the quantity itself, where both errors are normal, and we in its
// logarithm: the draws are normal in the quantity, so the order of the two is as
// improbable either way, and the density of the difference is skew by 2% only.
func TestPublishedSignificance(t *testing.T) {
	b, err := os.ReadFile("../../testdata/statistics/published.json")
	if err != nil {
		t.Fatal(err)
	}
	var p struct {
		A      float64 `json:"a"`
		AError float64 `json:"a_error"`
		B      float64 `json:"b"`
		BError float64 `json:"b_error"`
		Sigma  float64 `json:"sigma"`
	}
	if err := json.Unmarshal(b, &p); err != nil {
		t.Fatal(err)
	}
	const sets = 10
	mean := 0.0
	for seed := range uint64(sets) {
		rng := rand.New(rand.NewPCG(seed, 31))
		ln := [][]float64{make([]float64, 4000), make([]float64, 4000)}
		for i := range ln[0] {
			ln[0][i] = math.Log(p.A + p.AError*rng.NormFloat64())
			ln[1][i] = math.Log(p.B + p.BError*rng.NormFloat64())
		}
		sigma, _ := pairSigma(t, placeOf(ln))
		mean += sigma / sets
	}
	// 0.15σ is what 4000 draws are asked for at 4σ, 0.05σ the digits of the paper.
	if math.Abs(mean-p.Sigma) > 0.2 {
		t.Errorf("%.2fσ, published %.1fσ", mean, p.Sigma)
	}
}
