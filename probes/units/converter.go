package units

import (
	"math"
	"math/big"
	"strconv"
)

// Converter converts many numbers from one unit to another, with the digits of
// Convert and Decimal and much faster. It must not be used by two goroutines at
// once.
//
// It multiplies in two float64 (Dekker 1971), some 100 bits, bounds what that
// leaves out, and goes back to exact arithmetic for the few products so near to
// the middle between two float64 that the bound does not tell which is nearer.
type Converter struct {
	factor *big.Rat
	one    bool
	scaled [2*maxScaled + 1]double // factor × 10**e at index e+maxScaled, the zero value where not yet computed
	digits [32]byte
}

// maxScaled bounds the powers of ten that have a place in Converter.scaled.
const maxScaled = 60

// double is the unevaluated sum of two float64.
type double struct{ hi, lo float64 }

// NewConverter returns a Converter; it is an error when the two units have
// different dimensions.
func NewConverter(from, to Unit) (*Converter, error) {
	factor, err := Factor(from, to)
	if err != nil {
		return nil, err
	}
	return &Converter{factor: factor, one: factor.Cmp(one) == 0}, nil
}

// Decimal converts a number written as a decimal, like the function Decimal.
func (c *Converter) Decimal(text string) (float64, error) {
	if c.one && isDecimal(text) {
		if x, err := strconv.ParseFloat(text, 64); err == nil && x != 0 {
			return x, nil
		}
	}
	negative, mantissa, exponent, ok := split(text)
	if !ok {
		return decimalTimes(text, c.factor)
	}
	if mantissa == 0 {
		return 0, nil
	}
	x, ok := c.multiply(mantissa, exponent)
	if !ok {
		return decimalTimes(text, c.factor)
	}
	if negative {
		x = -x
	}
	return x, nil
}

// Float converts a float64 as Convert does: exactly multiplied, rounded once.
func (c *Converter) Float(x float64) (float64, error) {
	if math.IsNaN(x) || math.IsInf(x, 0) {
		return 0, ErrNotFinite
	}
	if x == 0 {
		return 0, nil
	}
	if c.one {
		return x, nil
	}
	if y, ok := nearest(math.Abs(x), 0, c.at(0)); ok {
		return math.Copysign(y, x), nil
	}
	return rounded(times(new(big.Rat).SetFloat64(x), c.factor))
}

// Shortest converts a float64 as the shortest decimal that reads back as it,
// which is how any program prints it: the digits are those that Decimal gives
// for the same table written as text.
func (c *Converter) Shortest(x float64) (float64, error) {
	if c.one || x == 0 || math.IsNaN(x) || math.IsInf(x, 0) {
		return c.Float(x)
	}
	text := strconv.AppendFloat(c.digits[:0], math.Abs(x), 'e', -1, 64) // d.ddde±dd, at most 17 digits
	mantissa, exponent, i := uint64(text[0]-'0'), 0, 1
	if text[i] == '.' {
		for i++; text[i] != 'e'; i++ {
			mantissa = 10*mantissa + uint64(text[i]-'0')
			exponent--
		}
	}
	written := 0
	for _, digit := range text[i+2:] {
		written = 10*written + int(digit-'0')
	}
	if text[i+1] == '-' {
		written = -written
	}
	if y, ok := c.multiply(mantissa, exponent+written); ok {
		return math.Copysign(y, x), nil
	}
	return decimalTimes(strconv.FormatFloat(x, 'e', -1, 64), c.factor)
}

// multiply returns mantissa × 10**exponent × factor rounded to nearest, and
// whether it could.
func (c *Converter) multiply(mantissa uint64, exponent int) (float64, bool) {
	if exponent > maxScaled || exponent < -maxScaled {
		return 0, false
	}
	hi := float64(mantissa)
	lo := float64(int64(mantissa - uint64(hi)))
	return nearest(hi, lo, c.at(exponent))
}

// at returns factor × 10**exponent.
func (c *Converter) at(exponent int) double {
	d := &c.scaled[exponent+maxScaled]
	if d.hi == 0 {
		exactly := times(c.factor, powerOfTen(exponent))
		d.hi, _ = exactly.Float64()
		if !math.IsInf(d.hi, 0) {
			d.lo, _ = exactly.Sub(exactly, new(big.Rat).SetFloat64(d.hi)).Float64()
		}
	}
	return *d
}

// nearest returns the float64 nearest to (hi+lo)·f for hi > 0 and |lo| ≤
// 2⁻⁵³ hi, and whether that is certain. Of the exact product it leaves out less
// than 2⁻¹⁰² of its size: lo·f.lo, what f leaves out, and three roundings of
// numbers below 2⁻⁵² of it.
func nearest(hi, lo float64, f double) (float64, bool) {
	p := hi * f.hi
	if !(p > 1e-250 && p < 1e300 && f.hi > 1e-250) { // no rounding error may underflow
		return 0, false
	}
	rest := math.FMA(hi, f.hi, -p) + math.FMA(hi, f.lo, lo*f.hi)
	bound := p * 0x1p-98
	below, above := p+(rest-bound), p+(rest+bound)
	return below, below == above
}

// isDecimal reports whether the text is a decimal number, sign allowed, of a
// usual length and nothing else.
func isDecimal(text string) bool {
	if text == "" || len(text) > 40 {
		return false
	}
	i := 0
	if text[0] == '+' || text[0] == '-' {
		i = 1
	}
	end := scanNumber(text, i)
	return end > i && end == len(text)
}

// split reads a decimal of at most 18 digits as ± mantissa × 10**exponent; ok
// is false for anything else, numbers of more digits among it.
func split(text string) (negative bool, mantissa uint64, exponent int, ok bool) {
	if !isDecimal(text) {
		return false, 0, 0, false
	}
	i := 0
	if text[0] == '+' || text[0] == '-' {
		negative = text[0] == '-'
		i = 1
	}
	digits, point := 0, false
	for ; i < len(text) && text[i]|0x20 != 'e'; i++ {
		if text[i] == '.' {
			point = true
			continue
		}
		if mantissa > 0 || text[i] != '0' {
			digits++
		}
		mantissa = 10*mantissa + uint64(text[i]-'0')
		if point {
			exponent--
		}
		if digits > 18 {
			return false, 0, 0, false
		}
	}
	if i < len(text) {
		e, err := strconv.Atoi(text[i+1:])
		if err != nil || e > maxExponent || e < -maxExponent {
			return false, 0, 0, false
		}
		exponent += e
	}
	return negative, mantissa, exponent, true
}
