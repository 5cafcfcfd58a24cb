package units

import (
	"fmt"
	"math/big"
	"strconv"
	"strings"
)

// Bounds on a written number, so that "1e999999999" costs nothing: float64 ends
// at 1e308, and a unit moves a number by at most some hundred powers of ten.
const (
	maxDigits   = 400
	maxExponent = 400
)

// Error is a mistake in the text of a unit or a quantity.
type Error struct {
	Text   string // what was being read
	Offset int    // byte in Text where the mistake is
	Reason string // what is wrong and what was expected
}

// Error implements error.
func (e *Error) Error() string { return fmt.Sprintf("%q: %s", e.Text, e.Reason) }

// scanNumber returns the end of the unsigned decimal number that begins at
// text[i], or i when none does: digits with at most one point among or after
// them, and an exponent when digits follow the e.
func scanNumber(text string, i int) int {
	j := scanDigits(text, i)
	digits := j - i
	if j < len(text) && text[j] == '.' {
		k := scanDigits(text, j+1)
		digits += k - j - 1
		if k > j+1 || digits > 0 && !beginsSymbol(text[j+1:]) {
			j = k
		}
	}
	if digits == 0 {
		return i
	}
	if j < len(text) && (text[j] == 'e' || text[j] == 'E') {
		k := j + 1
		if k < len(text) && (text[k] == '+' || text[k] == '-') {
			k++
		}
		if end := scanDigits(text, k); end > k {
			j = end
		}
	}
	return j
}

func scanDigits(text string, i int) int {
	for i < len(text) && '0' <= text[i] && text[i] <= '9' {
		i++
	}
	return i
}

// exact returns the value of a number that scanNumber found, sign allowed.
func exact(number string) (*big.Rat, error) {
	mantissa, exponent := number, ""
	if i := strings.IndexAny(number, "eE"); i >= 0 {
		mantissa, exponent = number[:i], number[i+1:]
	}
	if len(mantissa) > maxDigits {
		return nil, fmt.Errorf("a number of more than %d digits", maxDigits)
	}
	if exponent != "" {
		if e, err := strconv.Atoi(exponent); err != nil || e > maxExponent || e < -maxExponent {
			return nil, fmt.Errorf("the exponent %s is beyond what a number can hold", exponent)
		}
	}
	r, ok := new(big.Rat).SetString(number)
	if !ok {
		return nil, fmt.Errorf("not a decimal number")
	}
	return r, nil
}
