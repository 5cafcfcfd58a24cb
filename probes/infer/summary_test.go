package infer

import (
	"math"
	"testing"
)

func TestPercentiles(t *testing.T) {
	values := []float64{4, 1, 3, 2}
	// Hyndman & Fan 1996, definition 5; R's quantile(1:4, type = 5) from memory,
	// and by hand: the k-th of 4 stands at 12.5, 37.5, 62.5, 87.5 per cent.
	want := []float64{1, 1.14, 2.5, 3.86, 4, 1, 4}
	for i, got := range Percentiles(values, 12.5, 16, 50, 84, 87.5, 0, 100) {
		if math.Abs(got-want[i]) > 1e-14 {
			t.Errorf("percentile %d is %g, want %g", i, got, want[i])
		}
	}
	if values[0] != 4 {
		t.Error("the values were sorted in place")
	}
	if got := Percentiles([]float64{7}, 16, 84); got[0] != 7 || got[1] != 7 {
		t.Errorf("percentiles of one value: %v", got)
	}
	for _, bad := range [][]float64{nil, {1, math.NaN(), 2}} {
		if got := Percentiles(bad, 50)[0]; !math.IsNaN(got) {
			t.Errorf("median of %v is %g, want NaN", bad, got)
		}
	}
}

func TestChiSquareP(t *testing.T) {
	// scipy.stats.chi2.sf; for even dof it agrees with the finite sum
	// exp(−x/2) Σ (x/2)^k/k!. 1e-12 leaves room for exp of a rounded argument.
	for _, c := range []struct {
		chi2 float64
		dof  int
		want float64
	}{
		{8.1, 8, 0.42376332945798567}, {1, 1, 0.31731050786291115}, {110, 14, 5.594690804833132e-17}, {0.5, 3, 0.9188914116546758}, {200, 2, 3.7200759760208177e-44}, {1000, 10, 1.870290720915977e-208},
		{1400, 3, 2.945619361016289e-303}, {3000, 2500, 1.394560659466454e-11}, {1e-3, 1, 0.9747728793699604}, {0, 5, 1}, {12, 0, 1},
	} {
		if got := ChiSquareP(c.chi2, c.dof); math.Abs(got/c.want-1) > 1e-12 {
			t.Errorf("χ² = %g for %d: p = %v, want %v", c.chi2, c.dof, got, c.want)
		}
	}
	if got := ChiSquareP(math.Inf(1), 3); got != 0 {
		t.Errorf("infinite χ²: p = %g", got)
	}
}
