// Package prior holds the one-dimensional prior distributions a recipe can
// state for an assumption, and the map of each through its own quantiles to a
// unit normal, the "score" in which posteriors are explored and shared
// nuisances are compared.
//
// A Prior is a small comparable value: two priors with equal fields are the
// same prior, and its fields may be hashed.
package prior

import (
	"fmt"
	"math"
)

// Kind names the family of a Prior.
type Kind uint8

// The families. Exact is a number without an error; it is never drawn.
const (
	ExactKind Kind = iota
	NormalKind
	HalfNormalKind
	LogNormalKind
	UniformKind
	LogUniformKind
	TwoPieceKind
)

// Prior is one distribution. A, B and C mean, by Kind:
//
//	Exact       A the value
//	Normal      A mean, B standard deviation
//	HalfNormal  A standard deviation of the normal whose positive half it is
//	LogNormal   A median, B standard deviation of the natural logarithm
//	Uniform     A lower, B upper limit
//	LogUniform  A lower, B upper limit, both positive
//	TwoPiece    A the 50th, A−B the 16th and A+C the 84th percentile
//
// The zero value is the exact number 0. Build priors with the functions below,
// which refuse impossible arguments.
type Prior struct {
	Kind    Kind
	A, B, C float64
}

// Exact returns the prior of a number without error.
func Exact(x float64) Prior { return Prior{Kind: ExactKind, A: x} }

// IsExact reports whether p is a number without error.
func (p Prior) IsExact() bool { return p.Kind == ExactKind }

// Normal returns a normal distribution; sd must be positive and finite.
func Normal(mean, sd float64) (Prior, error) {
	return checked(Prior{Kind: NormalKind, A: mean, B: sd}, sd > 0, "the standard deviation must be positive")
}

// HalfNormal returns the positive half of a normal distribution about zero.
func HalfNormal(sd float64) (Prior, error) {
	return checked(Prior{Kind: HalfNormalKind, A: sd}, sd > 0, "the standard deviation must be positive")
}

// LogNormal returns a distribution whose natural logarithm is normal.
func LogNormal(median, sdLn float64) (Prior, error) {
	return checked(Prior{Kind: LogNormalKind, A: median, B: sdLn}, median > 0 && sdLn > 0, "the median and the standard deviation of the logarithm must be positive")
}

// Uniform returns a flat distribution between lo and hi.
func Uniform(lo, hi float64) (Prior, error) {
	return checked(Prior{Kind: UniformKind, A: lo, B: hi}, lo < hi, "the lower limit must be below the upper limit")
}

// LogUniform returns a distribution flat in the logarithm between lo and hi.
func LogUniform(lo, hi float64) (Prior, error) {
	return checked(Prior{Kind: LogUniformKind, A: lo, B: hi}, 0 < lo && lo < hi, "the limits must be positive, the lower below the upper")
}

// TwoPiece returns the two-piece normal whose 16th, 50th and 84th percentiles
// are x−minus, x and x+plus. In score s it is x + plus·s/z above and
// x + minus·s/z below the median, with z = Φ⁻¹(0.84) = 0.99446: the percentiles
// are kept to the letter, so that the lo and hi a weighing prints, read back as
// a reported mass, come out as the same lo and hi. An interval quoted at one
// standard deviation (15.87 to 84.13 per cent) is taken as 0.6 per cent wider
// than it was meant; a symmetric error belongs in Normal, where it is exact.
func TwoPiece(x, minus, plus float64) (Prior, error) {
	return checked(Prior{Kind: TwoPieceKind, A: x, B: minus, C: plus}, minus > 0 && plus > 0, "both errors must be positive")
}

func checked(p Prior, ok bool, reason string) (Prior, error) {
	for _, v := range []float64{p.A, p.B, p.C} {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return Prior{}, fmt.Errorf("the arguments must be finite numbers")
		}
	}
	if !ok {
		return Prior{}, fmt.Errorf("%s", reason)
	}
	return p, nil
}
