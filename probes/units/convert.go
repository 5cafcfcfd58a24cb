package units

import (
	"errors"
	"math"
	"math/big"
)

// Convert multiplies a float64 exactly by the factor from one unit to another
// and rounds once.
func Convert(x float64, from, to Unit) (float64, error) {
	factor, err := Factor(from, to)
	if err != nil {
		return 0, err
	}
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return 0, errNotFinite
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
	x, err := signed(text)
	if err != nil {
		return 0, err
	}
	return rounded(times(x, factor))
}

var (
	errNotFinite = errors.New("not a finite number")
	errNotNumber = errors.New("not a number")
	errRange     = errors.New("a number that double precision cannot hold")
)

// signed reads a decimal with an optional sign and nothing else.
func signed(text string) (*big.Rat, error) {
	start := 0
	if text != "" && (text[0] == '+' || text[0] == '-') {
		start = 1
	}
	if end := scanNumber(text, start); end == start || end != len(text) {
		return nil, errNotNumber
	}
	return exact(text)
}

// rounded returns the nearest float64. It refuses numbers that overflow, or
// that are not zero and would become zero.
func rounded(x *big.Rat) (float64, error) {
	f, _ := x.Float64()
	if math.IsInf(f, 0) || f == 0 && x.Sign() != 0 {
		return 0, errRange
	}
	return f, nil
}
