package infer

import (
	"math"
	"sort"
)

// smooth fits a generalised Pareto distribution to the largest of the log
// weights and replaces them, in their order, by its expected order statistics
// (Pareto-smoothed importance sampling, Vehtari et al. 2024). It returns the
// shape k̂: the estimates converge fast below 0.5, usefully up to 0.7, and not
// to be trusted above. The tail is min(n/5, 3√n) weights; with fewer than five,
// or when they are all alike, nothing is done and k̂ is −Inf.
func smooth(lnW []float64) (shape float64) {
	n := len(lnW)
	tail := int(math.Ceil(min(float64(n)/5, 3*math.Sqrt(float64(n)))))
	if tail < 5 || tail >= n {
		return math.Inf(-1)
	}
	order := make([]int, n)
	for i := range order {
		order[i] = i
	}
	sort.SliceStable(order, func(a, b int) bool { return lnW[order[a]] < lnW[order[b]] })
	most, cut := lnW[order[n-1]], lnW[order[n-tail-1]]
	if math.IsInf(most, -1) || !(most > cut) {
		return math.Inf(-1)
	}
	excess := make([]float64, tail)
	limit := math.Exp(cut - most)
	for i := range excess {
		excess[i] = math.Exp(lnW[order[n-tail+i]]-most) - limit
	}
	if !(excess[0] < excess[tail-1]) {
		return math.Inf(-1)
	}
	shape, scale := fitPareto(excess)
	if math.IsNaN(shape) {
		return math.Inf(1)
	}
	for i := range excess {
		p := (float64(i) + 0.5) / float64(tail)
		q := -scale * math.Log1p(-p)
		if shape != 0 {
			q = scale * math.Expm1(-shape*math.Log1p(-p)) / shape
		}
		lnW[order[n-tail+i]] = min(math.Log(q+limit), 0) + most
	}
	return shape
}

// fitPareto estimates shape and scale of a generalised Pareto distribution
//
//	F(x) = 1 − (1 + k x/σ)^(−1/k)
//
// from rising excesses, by the quasi-Bayesian method of Zhang & Stephens
// (2009), the shape drawn slightly towards ½ as ten observations would
// (Vehtari et al. 2024).
func fitPareto(x []float64) (shape, scale float64) {
	n := len(x)
	points := 30 + int(math.Sqrt(float64(n)))
	quarter := x[int(float64(n)/4+0.5)-1]
	if !(quarter > 0) {
		// More than a quarter sit on the cut: use the first that does not.
		for _, v := range x {
			if v > 0 {
				quarter = v
				break
			}
		}
	}
	theta, profile := make([]float64, points), make([]float64, points)
	for j := range theta {
		theta[j] = 1/x[n-1] + (1-math.Sqrt(float64(points)/(float64(j)+0.5)))/(3*quarter)
		k := meanLog1p(-theta[j], x)
		profile[j] = float64(n) * (math.Log(-theta[j]/k) - k - 1)
	}
	best := 0.0
	for j := range theta {
		sum := 0.0
		for i := range profile {
			sum += math.Exp(profile[i] - profile[j])
		}
		best += theta[j] / sum
	}
	k := meanLog1p(-best, x)
	scale = -k / best
	const lean = 10.0
	shape = (k*float64(n) + lean*0.5) / (float64(n) + lean)
	return shape, scale
}

// meanLog1p is the mean of ln(1 + b x).
func meanLog1p(b float64, x []float64) float64 {
	sum := 0.0
	for _, v := range x {
		sum += math.Log1p(b * v)
	}
	return sum / float64(len(x))
}
