package infer

import (
	"math"
	"slices"
	"sort"

	"gonum.org/v1/gonum/mathext"
)

// The diagnostics of Vehtari, Gelman, Simpson, Carpenter & Bürkner (2021) for
// Markov chains. chains[c][i] is value i of chain c; all are equally long.

// rHat is the rank-normalised split R̂, the larger of that of the values and
// that of their distance from the median: the spread between half chains over
// the spread within them, 1 when they agree. Chains that stand still have +Inf.
func rHat(chains [][]float64) float64 {
	half := split(chains)
	return max(plainRHat(rankNormalised(half)), plainRHat(rankNormalised(folded(half))))
}

// bulkESS is the effective number of draws for the middle of the distribution.
func bulkESS(chains [][]float64) float64 { return plainESS(rankNormalised(split(chains))) }

// tailESS is the effective number for its 5th and 95th percentiles, whichever
// is smaller.
func tailESS(chains [][]float64) float64 {
	half := split(chains)
	sorted := slices.Concat(half...)
	sort.Float64s(sorted)
	least := math.Inf(1)
	for _, p := range []float64{0.05, 0.95} {
		// Linear between the order statistics (Hyndman & Fan 1996, definition 7).
		at := p * float64(len(sorted)-1)
		k := int(at)
		q := sorted[k]
		if k+1 < len(sorted) {
			q += (at - float64(k)) * (sorted[k+1] - sorted[k])
		}
		below := make([][]float64, len(half))
		for c, chain := range half {
			below[c] = make([]float64, len(chain))
			for i, v := range chain {
				if v <= q {
					below[c][i] = 1
				}
			}
		}
		least = min(least, plainESS(below))
	}
	return least
}

// split cuts every chain in two; a middle value is left out.
func split(chains [][]float64) [][]float64 {
	var out [][]float64
	for _, c := range chains {
		n := len(c) / 2
		out = append(out, c[:n], c[len(c)-n:])
	}
	return out
}

func folded(chains [][]float64) [][]float64 {
	sorted := slices.Concat(chains...)
	sort.Float64s(sorted)
	n := len(sorted)
	median := (sorted[(n-1)/2] + sorted[n/2]) / 2
	out := make([][]float64, len(chains))
	for c, chain := range chains {
		out[c] = make([]float64, len(chain))
		for i, v := range chain {
			out[c][i] = math.Abs(v - median)
		}
	}
	return out
}

// rankNormalised replaces each value by the unit-normal score of its rank r
// among all S values, Φ⁻¹((r − 3/8)/(S + 1/4)); equal values share their mean
// rank.
func rankNormalised(chains [][]float64) [][]float64 {
	flat := slices.Concat(chains...)
	order := make([]int, len(flat))
	for i := range order {
		order[i] = i
	}
	sort.SliceStable(order, func(a, b int) bool { return flat[order[a]] < flat[order[b]] })
	z := make([]float64, len(flat))
	for from := 0; from < len(order); {
		to := from
		for to < len(order) && flat[order[to]] == flat[order[from]] {
			to++
		}
		rank := float64(from+1+to) / 2
		for _, i := range order[from:to] {
			z[i] = mathext.NormalQuantile((rank - 0.375) / (float64(len(flat)) + 0.25))
		}
		from = to
	}
	out := make([][]float64, len(chains))
	for c, chain := range chains {
		out[c], z = z[:len(chain)], z[len(chain):]
	}
	return out
}

// spread returns the mean variance within chains and the variance of their
// means.
func spread(chains [][]float64) (within, between float64) {
	means := make([]float64, len(chains))
	for c, chain := range chains {
		var v float64
		means[c], v = meanVariance(chain)
		within += v / float64(len(chains))
	}
	_, between = meanVariance(means)
	return within, between
}

func meanVariance(x []float64) (mean, variance float64) {
	for _, v := range x {
		mean += v / float64(len(x))
	}
	for _, v := range x {
		variance += (v - mean) * (v - mean) / float64(len(x)-1)
	}
	return mean, variance
}

func plainRHat(chains [][]float64) float64 {
	n := float64(len(chains[0]))
	within, between := spread(chains)
	if !(within > 0) {
		return math.Inf(1)
	}
	return math.Sqrt((n-1)/n + between/within)
}

// plainESS is the effective number of draws from the autocorrelation of all
// chains together, cut off where the sum of a pair of lags turns negative and
// made monotone (Geyer 1992). It is 0 for chains that stand still.
func plainESS(chains [][]float64) float64 {
	n, total := len(chains[0]), len(chains)*len(chains[0])
	within, between := spread(chains)
	pooled := within*float64(n-1)/float64(n) + between
	if n < 4 || !(within > 0) {
		return 0
	}
	centred := make([][]float64, len(chains))
	for c, chain := range chains {
		mean, _ := meanVariance(chain)
		centred[c] = make([]float64, n)
		for i, v := range chain {
			centred[c][i] = v - mean
		}
	}
	rho := func(lag int) float64 {
		sum := 0.0
		for _, x := range centred {
			sum += dot(x[:n-lag], x[lag:])
		}
		return 1 - (within-sum/float64(total))/pooled
	}
	tau, last := 0.0, math.Inf(1)
	for lag := 0; lag+1 < n; lag += 2 {
		even := 1.0
		if lag > 0 {
			even = rho(lag)
		}
		pair := even + rho(lag+1)
		if pair < 0 {
			tau += max(even, 0)
			break
		}
		last = min(last, pair)
		tau += 2 * last
	}
	// Draws that avoid each other may count for more than their number, within
	// limits.
	tau = max(tau-1, 1/math.Log10(float64(total)))
	return float64(total) / tau
}
