package units

import (
	"fmt"
	"math/big"
	"strings"
)

// Quantity is a number with a unit and perhaps errors, all exact decimals.
type Quantity struct {
	Value    *big.Rat
	Minus    *big.Rat // size of the error below; nil for none
	Plus     *big.Rat // size of the error above; equal to Minus when symmetric; nil for none
	Unit     Unit
	HasUnit  bool // whether the text named a unit at all
	TwoSided bool // written as +a -b
}

// ParseQuantity reads a number, an optional error and a unit: "0.3",
// "70 km/s/Mpc", "18.4 +- 0.6 arcsec" (also ± and +/-),
// "6.1 +0.9 -0.8 10**14 solMass". Errors are sizes, in the same unit as the
// value, and positive. The error is an *Error.
func ParseQuantity(text string) (Quantity, error) {
	const expected = `expected a number, an optional error and a unit, like "18.4 +- 0.6 arcsec"`
	if len(text) > 4*maxDigits {
		return Quantity{}, &Error{text[:40] + "…", 0, "far too long for a quantity"}
	}
	p := &parser{text: text}
	var q Quantity
	var err error
	p.space()
	if p.i == len(p.text) {
		return Quantity{}, p.fail(p.i, "nothing is written; %s", expected)
	}
	if q.Value, err = p.number(true, expected); err != nil {
		return Quantity{}, err
	}
	p.space()
	if err = p.errors(&q); err != nil {
		return Quantity{}, err
	}
	if err = p.unit(&q); err != nil {
		return Quantity{}, err
	}
	return q, nil
}

// number reads a decimal, with a sign when signed.
func (p *parser) number(signed bool, expected string) (*big.Rat, error) {
	p.space()
	start := p.i
	negative := false
	switch {
	case p.minus():
		negative = true
	case p.has("+"):
	}
	if (negative || p.i > start) && !signed {
		return nil, p.fail(start, "the size of an error is written without a sign of its own")
	}
	end := scanNumber(p.text, p.i)
	if end == p.i {
		for _, word := range []string{"nan", "inf"} {
			if strings.HasPrefix(strings.ToLower(p.rest()), word) {
				return nil, p.fail(start, "%s is not a finite number", p.rest()[:len(word)])
			}
		}
		return nil, p.fail(start, "%s", expected)
	}
	value, err := exact(p.text[p.i:end])
	if err != nil {
		return nil, p.fail(p.i, "%v", err)
	}
	p.i = end
	if rest := p.rest(); len(rest) > 1 && (rest[0] == ',' || rest[0] == '_') && '0' <= rest[1] && rest[1] <= '9' {
		return nil, p.fail(p.i, "a number is written without %q: a point for decimals and nothing between thousands", rest[:1])
	}
	if negative {
		value.Neg(value)
	}
	return value, nil
}

// minus steps over a hyphen or a minus sign.
func (p *parser) minus() bool { return p.has("-") || p.has("−") }

// errors reads the errors of a quantity, if any.
func (p *parser) errors(q *Quantity) (err error) {
	const size = "expected the size of the error, a positive number"
	start := p.i
	switch {
	case p.has("+-"), p.has("+/-"), p.has("±"):
		if q.Plus, err = p.number(false, size); err != nil {
			return err
		}
		q.Minus = q.Plus
	case p.has("+"):
		q.TwoSided = true
		if q.Plus, err = p.number(false, size); err != nil {
			return err
		}
		p.space()
		if !p.minus() {
			return p.fail(start, "the error above, +a, must be followed by the error below, -b (a power of ten is written 10**14)")
		}
		if q.Minus, err = p.number(false, size); err != nil {
			return err
		}
	case p.minus():
		q.TwoSided = true
		if q.Minus, err = p.number(false, size); err != nil {
			return err
		}
		p.space()
		if !p.has("+") {
			return p.fail(start, "the error below, -b, needs the error above, +a, beside it")
		}
		if q.Plus, err = p.number(false, size); err != nil {
			return err
		}
	default:
		return nil
	}
	if q.Plus.Sign() == 0 || q.Minus.Sign() == 0 {
		return p.fail(start, "an error of zero; leave the error out to state an exact number")
	}
	p.space()
	return nil
}

// unit reads what is left as the unit of the quantity.
func (p *parser) unit(q *Quantity) error {
	mark := p.i
	if (p.has("x") || p.has("×") || p.has("*")) && func() bool { p.space(); return strings.HasPrefix(p.rest(), "10") }() {
		mark = p.i
	}
	rest := strings.TrimRight(p.text[mark:], " \t")
	for _, sign := range []string{"+-", "+/-", "±"} {
		if i := strings.Index(rest, sign); i > 0 {
			return p.fail(mark+i, "the unit is written once, behind the error: \"18.4 +- 0.6 arcsec\"")
		}
	}
	u, err := Parse(rest)
	if err != nil {
		if e, ok := err.(*Error); ok {
			return &Error{p.text, mark + e.Offset, e.Reason}
		}
		return err
	}
	q.Unit, q.HasUnit = u, rest != ""
	return nil
}

// In converts the value and errors to the unit, each multiplied exactly and
// rounded to float64 once; absent errors are 0.
func (q Quantity) In(u Unit) (value, minus, plus float64, err error) {
	factor, err := Factor(q.Unit, u)
	if err != nil {
		return 0, 0, 0, err
	}
	for _, part := range []struct {
		from *big.Rat
		to   *float64
	}{{q.Value, &value}, {q.Minus, &minus}, {q.Plus, &plus}} {
		if part.from == nil {
			continue
		}
		if *part.to, err = rounded(times(part.from, factor)); err != nil {
			return 0, 0, 0, fmt.Errorf("%w in %s", err, u.name())
		}
	}
	return value, minus, plus, nil
}
