package infer

import (
	"math"
	"sort"

	"gonum.org/v1/gonum/mathext"
)

// Percentiles returns the given percentiles (0 to 100) of the values, which are
// left as they are. The k-th smallest of n values is the percentile
// 100 (k − ½)/n, and between them it is linear (Hyndman & Fan 1996,
// definition 5): the median of 1, 2, 3, 4 is 2.5. Below the first and above the
// last it is the extreme value. Without values, or with a NaN among them, every
// percentile is NaN.
func Percentiles(values []float64, percents ...float64) []float64 {
	sorted := append([]float64(nil), values...)
	sort.Float64s(sorted) // NaN sorts first
	out := make([]float64, len(percents))
	n := len(sorted)
	for i, p := range percents {
		if n == 0 || math.IsNaN(sorted[0]) || math.IsNaN(p) {
			out[i] = math.NaN()
			continue
		}
		at := min(max(p/100*float64(n)-0.5, 0), float64(n-1))
		k := int(at)
		out[i] = sorted[k]
		if part := at - float64(k); part > 0 {
			out[i] += part * (sorted[k+1] - sorted[k])
		}
	}
	return out
}

// ChiSquareP returns the probability that χ² with dof degrees of freedom
// exceeds chi2, the p-value of a fit, with its relative accuracy kept in the
// far tail: Q(dof/2, χ²/2), the upper incomplete gamma function. It is 1 when
// dof is 0 or less, for then nothing was fitted.
func ChiSquareP(chi2 float64, dof int) float64 {
	switch {
	case dof <= 0 || chi2 <= 0:
		return 1
	case math.IsInf(chi2, 1):
		return 0
	}
	return mathext.GammaIncRegComp(float64(dof)/2, chi2/2)
}
