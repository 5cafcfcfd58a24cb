package units

import (
	"fmt"
	"math/big"
	"strconv"
	"strings"
)

// factor is a unit symbol raised to a power.
type factor struct {
	unit  entry
	power int
}

// compose multiplies the factors and writes the unit's VOUnits spelling.
func compose(text string, scale *big.Rat, factors []factor) (Unit, error) {
	factors = merge(factors)
	u := Unit{scale: big.NewRat(1, 1)}
	if scale != nil {
		u.scale.Set(scale)
	}
	var powers [len(u.dim)]int
	for _, f := range factors {
		if f.power > maxPower || f.power < -maxPower {
			return Unit{}, &Error{text, 0, fmt.Sprintf("a power beyond %d", maxPower)}
		}
		for i, d := range f.unit.dim {
			powers[i] += f.power * int(d)
		}
		u.scale.Mul(u.scale, power(f.unit.size, f.power))
	}
	for i, p := range powers {
		if p > 127 || p < -127 {
			return Unit{}, &Error{text, 0, "a power that no quantity has"}
		}
		u.dim[i] = int8(p)
	}
	u.text = spell(scale, factors)
	return u, nil
}

// merge adds the powers of equal symbols, in order of first appearance.
func merge(factors []factor) []factor {
	var merged []factor
next:
	for _, f := range factors {
		for i := range merged {
			if merged[i].unit.name == f.unit.name {
				merged[i].power += f.power
				continue next
			}
		}
		merged = append(merged, f)
	}
	kept := merged[:0]
	for _, f := range merged {
		if f.power != 0 {
			kept = append(kept, f)
		}
	}
	return kept
}

func power(x *big.Rat, n int) *big.Rat {
	if n < 0 {
		return power(new(big.Rat).Inv(x), -n)
	}
	e := big.NewInt(int64(n))
	return new(big.Rat).SetFrac(new(big.Int).Exp(x.Num(), e, nil), new(big.Int).Exp(x.Denom(), e, nil))
}

// spell writes the unit as VOUnits does, with at most one slash.
func spell(scale *big.Rat, factors []factor) string {
	var above, below []string
	for _, f := range factors {
		if f.power > 0 {
			above = append(above, raised(f.unit.name, f.power))
		} else {
			below = append(below, raised(f.unit.name, -f.power))
		}
	}
	text := strings.Join(above, ".")
	switch {
	case len(above) > 0 && len(below) == 1:
		text += "/" + below[0]
	case len(below) > 0:
		for _, f := range factors {
			if f.power < 0 {
				if text != "" {
					text += "."
				}
				text += raised(f.unit.name, f.power)
			}
		}
	}
	return spellScale(scale) + text
}

func raised(name string, power int) string {
	if power == 1 {
		return name
	}
	return name + "**" + strconv.Itoa(power)
}

// spellScale writes a scale factor: "" for 1, "10**14", else a decimal.
func spellScale(scale *big.Rat) string {
	if scale == nil || scale.Cmp(one) == 0 {
		return ""
	}
	digits, exponent := digitsOf(scale)
	if digits == "1" {
		return "10**" + strconv.Itoa(exponent)
	}
	if len(digits) > 1 {
		exponent += len(digits) - 1
		digits = digits[:1] + "." + digits[1:]
	}
	return fmt.Sprintf("%se%+d", digits, exponent)
}

// digitsOf writes a positive terminating decimal as digits × 10**exponent, the
// digits without trailing zeros.
func digitsOf(x *big.Rat) (digits string, exponent int) {
	n, _ := x.FloatPrec() // decimals after the point; the number came from a decimal, so exact
	digits = strings.TrimLeft(strings.Replace(x.FloatString(n), ".", "", 1), "0")
	trimmed := strings.TrimRight(digits, "0")
	return trimmed, len(digits) - len(trimmed) - n
}
