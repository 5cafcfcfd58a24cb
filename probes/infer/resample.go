package infer

import (
	"math"
	"math/rand/v2"
)

// normalised turns log weights into weights that sum to one, and returns ln of
// their mean as they were.
func normalised(lnW []float64) (w []float64, lnMean float64) {
	most := math.Inf(-1)
	for _, l := range lnW {
		most = max(most, l)
	}
	w = make([]float64, len(lnW))
	if math.IsInf(most, -1) {
		return w, most
	}
	sum := 0.0
	for i, l := range lnW {
		w[i] = math.Exp(l - most)
		sum += w[i]
	}
	for i := range w {
		w[i] /= sum
	}
	return w, most + math.Log(sum/float64(len(lnW)))
}

// kish is the effective size (Σw)²/Σw² of weights that sum to one.
func kish(w []float64) float64 {
	sum := 0.0
	for _, v := range w {
		sum += v * v
	}
	if sum == 0 {
		return 0
	}
	return 1 / sum
}

// resample picks n of the weighted points by systematic resampling: point i is
// taken ⌊n w_i⌋ or ⌈n w_i⌉ times. The picks are shuffled, for draws are paired
// by index elsewhere.
//
// effective is the size of the picks, n²/Σ c_i² for counts c_i, with the
// expectation of c_i² over the random offset,
//
//	1/effective = Σ w_i² + Σ r_i (1 − r_i) / n²,  r_i = n w_i − ⌊n w_i⌋,
//
// so it counts the uneven weights and the resampling both.
func resample(w []float64, n int, rng *rand.Rand) (picks []int, effective float64) {
	u := rng.Float64()
	sum, inverse := 0.0, 0.0
	for i, v := range w {
		sum += v
		for len(picks) < n && u+float64(len(picks)) < sum*float64(n) {
			picks = append(picks, i)
		}
		r := v * float64(n)
		r -= math.Floor(r)
		inverse += v*v + r*(1-r)/float64(n)/float64(n)
	}
	for last := len(w) - 1; len(picks) < n; { // rounding in the sum
		for w[last] == 0 {
			last--
		}
		picks = append(picks, last)
	}
	rng.Shuffle(n, func(i, j int) { picks[i], picks[j] = picks[j], picks[i] })
	return picks, 1 / inverse
}
