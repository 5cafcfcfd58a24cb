package units

import (
	"errors"
	"math"
	"math/big"
)

// Reasons why a number cannot be converted.
var (
	// ErrNotNumber is returned when a text is not a decimal number.
	ErrNotNumber = errors.New("not a number")
	// ErrNotFinite is returned for NaN and the infinities.
	ErrNotFinite = errors.New("not a finite number")
	// ErrRange is returned when the result overflows double precision, or is
	// not zero and would become zero.
	ErrRange = errors.New("a number that double precision cannot hold")
)

// Convert multiplies a float64 exactly by the factor from one unit to another
// and rounds once.
func Convert(x float64, from, to Unit) (float64, error) {
	factor, err := Factor(from, to)
	if err != nil {
		return 0, err
	}
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return 0, ErrNotFinite
	}
	return rounded(times(new(big.Rat).SetFloat64(x), factor))
}

// Decimal converts a number written as an exact decimal ("1.001") from one unit
// to another, rounding once.
func Decimal(text string, from, to Unit) (float64, error) {
	factor, err := Factor(from, to)
	if err != nil {
		return 0, err
	}
	return decimalTimes(text, factor)
}

// decimalTimes reads a decimal, with a sign or not and nothing else beside it,
// and returns its product with the factor.
func decimalTimes(text string, factor *big.Rat) (float64, error) {
	start := 0
	if text != "" && (text[0] == '+' || text[0] == '-') {
		start = 1
	}
	if end := scanNumber(text, start); end == start || end != len(text) {
		return 0, ErrNotNumber
	}
	x, err := exact(text)
	if err != nil {
		return 0, ErrRange // beyond the bounds of exact
	}
	return rounded(x.Mul(x, factor))
}

// rounded returns the nearest float64.
func rounded(x *big.Rat) (float64, error) {
	f, _ := x.Float64()
	if math.IsInf(f, 0) || f == 0 && x.Sign() != 0 {
		return 0, ErrRange
	}
	return f, nil
}
