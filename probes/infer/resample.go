package infer

import (
	"cmp"
	"math"
	"math/rand/v2"
	"slices"
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
// squares[i] is the expectation, over the random offset, of (c_i/n)² for its
// count c_i: w_i² + r_i (1 − r_i)/n² with r_i = n w_i − ⌊n w_i⌋. It holds the
// uneven weights and the resampling both.
func resample(w []float64, n int, rng *rand.Rand) (picks []int, squares []float64) {
	u, sum := rng.Float64(), 0.0
	squares = make([]float64, len(w))
	last := 0
	for i, v := range w {
		sum += v
		for len(picks) < n && u+float64(len(picks)) < sum*float64(n) {
			picks, last = append(picks, i), i
		}
		r := v * float64(n)
		r -= math.Floor(r)
		squares[i] = v*v + r*(1-r)/float64(n)/float64(n)
	}
	for len(picks) < n { // the sum fell short of one by rounding
		picks = append(picks, last)
	}
	rng.Shuffle(n, func(i, j int) { picks[i], picks[j] = picks[j], picks[i] })
	return picks, squares
}

// effectiveDraws is the number of independent draws that would know the
// percentiles as well as draws with the given expected squared shares do:
//
//	p (1 − p) / Σ_i squares_i (1[x_i < q] − p)²,
//
// the worst over all coordinates and over the 2.5, 16, 50, 84 and 97.5
// percentiles q.
func effectiveDraws(z [][]float64, w, squares []float64) float64 {
	total := 0.0
	for _, v := range squares {
		total += v
	}
	order := make([]int, 0, len(w))
	for i, v := range w {
		if v > 0 {
			order = append(order, i)
		}
	}
	worst := math.Inf(1)
	for j := range z[0] {
		slices.SortFunc(order, func(a, b int) int { return cmp.Or(cmp.Compare(z[a][j], z[b][j]), a-b) })
		below, share, next := 0.0, 0.0, 0
		for _, p := range [...]float64{0.025, 0.16, 0.5, 0.84, 0.975} {
			for next < len(order) && share+w[order[next]] <= p {
				below += squares[order[next]]
				share += w[order[next]]
				next++
			}
			variance := below*(1-p)*(1-p) + (total-below)*p*p
			worst = min(worst, p*(1-p)/variance)
		}
	}
	return worst
}
