package reconcile

import (
	"math"

	"gonum.org/v1/gonum/mathext"
)

// Sigma returns the two-sided significance of a probability,
//
//	σ = √2 erfc⁻¹(p),
//
// by way of the lower normal tail, which keeps its digits down to the smallest
// float64. Sigma(1) is 0; p outside (0, 1] gives +Inf below and 0 above.
func Sigma(p float64) float64 {
	switch {
	case p <= 0:
		return math.Inf(1)
	case p >= 1:
		return 0
	}
	return -mathext.NormalQuantile(p / 2)
}

// TwoSided is the inverse of Sigma: the probability of a unit normal outside ±σ.
func TwoSided(sigma float64) float64 { return math.Erfc(math.Abs(sigma) / math.Sqrt2) }

// normalBelow is Φ(z), accurate for very negative z.
func normalBelow(z float64) float64 { return 0.5 * math.Erfc(-z/math.Sqrt2) }

// Verdict puts a significance into words by three rising limits.
func Verdict(sigma float64, limits [3]float64) string {
	s := math.Abs(sigma)
	switch {
	case s < limits[0]:
		return "consistent"
	case s < limits[1]:
		return "strained"
	case s < limits[2]:
		return "in tension"
	}
	return "incompatible"
}

// Limits are the usual limits of the verdict, in sigma.
var Limits = [3]float64{2, 3, 5}
