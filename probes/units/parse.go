package units

import (
	"fmt"
	"math/big"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// Bounds on what a unit's text may ask for.
const (
	maxUnitText = 200
	maxPower    = 24
)

// Parse reads a unit as VOUnits, FITS or CDS tables spell it, or with repeated
// slashes ("km/s/Mpc"). The empty string is the pure number.
//
//	unit    = [scale] [factor {("." | "*" | " " | "/") factor}]
//	factor  = (symbol | "(" unit without scale ")") [power]
//	power   = ("**" | "^") integer, in parentheses or not, or just the integer
//	scale   = decimal, perhaps times a power of ten: "10**14", "10^14", "10+14", "1.5x10+11"
//
// A product after a slash, as in "J/s.m", is refused as ambiguous. So are
// logarithms, fractional powers, units in quotes and the h of "Mpc/h", each
// with its reason. The error is an *Error.
func Parse(text string) (Unit, error) {
	if len(text) > maxUnitText {
		return Unit{}, &Error{text[:40] + "…", 0, fmt.Sprintf("a unit of more than %d characters", maxUnitText)}
	}
	p := parser{text: text}
	p.space()
	if rest := p.rest(); rest == "---" || rest == "-" { // CDS for "no unit"
		return Unit{}, nil
	}
	scale, err := p.scale()
	if err != nil {
		return Unit{}, err
	}
	factors, err := p.product(scale != nil, 0)
	if err != nil {
		return Unit{}, err
	}
	if p.i < len(p.text) {
		return Unit{}, p.fail(p.i, "%q was not expected here", p.next())
	}
	return compose(p.text, scale, factors)
}

// parser walks over the text of a unit.
type parser struct {
	text string
	i    int
}

func (p *parser) rest() string { return p.text[p.i:] }

// next returns the character at the cursor, for messages.
func (p *parser) next() string {
	_, n := utf8.DecodeRuneInString(p.rest())
	return p.rest()[:n]
}

// has steps over the literal when it is next.
func (p *parser) has(literal string) bool {
	if !strings.HasPrefix(p.rest(), literal) {
		return false
	}
	p.i += len(literal)
	return true
}

func (p *parser) space() bool {
	start := p.i
	for p.i < len(p.text) && (p.text[p.i] == ' ' || p.text[p.i] == '\t') {
		p.i++
	}
	return p.i > start
}

func (p *parser) fail(at int, format string, args ...any) error {
	return &Error{p.text, at, fmt.Sprintf(format, args...)}
}

// scale reads the leading number of a unit; nil when there is none.
func (p *parser) scale() (*big.Rat, error) {
	start := p.i
	end := scanNumber(p.text, p.i)
	if end == start {
		return nil, nil
	}
	value, err := exact(p.text[start:end])
	if err != nil {
		return nil, p.fail(start, "%v", err)
	}
	p.i = end
	ten := p.text[start:end] == "10"
	if !ten {
		mark := p.i
		p.space()
		if (p.has("x") || p.has("×") || p.has("*")) && func() bool { p.space(); return p.has("10") }() {
			ten = true
		} else {
			p.i = mark
		}
	} else {
		value = one
	}
	if ten {
		n, given, err := p.power()
		if err != nil {
			return nil, err
		}
		if !given {
			n = 1
		}
		value = times(value, powerOfTen(n))
	}
	if value.Sign() <= 0 {
		return nil, p.fail(start, "the scale of a unit must be positive")
	}
	if _, err := rounded(value); err != nil {
		return nil, p.fail(start, "the scale of the unit is beyond what a number can hold")
	}
	return value, nil
}

// product reads factors up to the end of the text or a closing parenthesis.
// After a scale, nothing, a space, a dot or a slash may come first.
func (p *parser) product(scaled bool, depth int) ([]factor, error) {
	var all []factor
	divided := false
	for first := true; ; first = false {
		spaced := p.space()
		if p.i == len(p.text) || p.text[p.i] == ')' && depth > 0 {
			if first && depth > 0 {
				return nil, p.fail(p.i, "a unit was expected in the parentheses")
			}
			return all, nil
		}
		at := p.i
		slash := p.has("/")
		if !slash {
			dot := p.has("**") // refused below: a power of nothing
			if dot {
				return nil, p.fail(at, "a power must stand right behind its unit")
			}
			dot = p.has(".") || p.has("*") || p.has("·")
			if first && dot && !scaled {
				return nil, p.fail(at, "a unit cannot begin with %q", p.text[at:p.i])
			}
			if !first && !dot && !spaced {
				return nil, p.fail(at, "%q was not expected here", p.next())
			}
			if divided {
				return nil, p.fail(at, "a product behind a slash is ambiguous: write negative powers (km.s**-1.Mpc**-1) or another slash (km/s/Mpc)")
			}
		}
		divided = divided || slash
		p.space()
		inner, err := p.factor(depth)
		if err != nil {
			return nil, err
		}
		for _, f := range inner {
			if slash {
				f.power = -f.power
			}
			all = append(all, f)
		}
	}
}

// factor reads a symbol or a parenthesis, with its power.
func (p *parser) factor(depth int) ([]factor, error) {
	start := p.i
	var inner []factor
	if p.has("(") {
		var err error
		if inner, err = p.product(false, depth+1); err != nil {
			return nil, err
		}
		if !p.has(")") {
			return nil, p.fail(start, "the parenthesis is not closed")
		}
	} else {
		e, err := p.symbol()
		if err != nil {
			return nil, err
		}
		inner = []factor{{e, 1}}
	}
	n, given, err := p.power()
	if err != nil {
		return nil, err
	}
	if given {
		for i := range inner {
			inner[i].power *= n
			if inner[i].power > maxPower || inner[i].power < -maxPower {
				return nil, p.fail(start, "a power beyond %d", maxPower)
			}
		}
	}
	return inner, nil
}

// power reads an exponent behind a symbol, a parenthesis or the number ten.
func (p *parser) power() (n int, given bool, err error) {
	start := p.i
	marked := p.has("**") || p.has("^")
	closing := false
	if marked {
		closing = p.has("(")
	}
	at := p.i
	if p.i < len(p.text) && (p.text[p.i] == '+' || p.text[p.i] == '-') {
		p.i++
	}
	end := scanDigits(p.text, p.i)
	if end == p.i {
		if marked || p.i > at {
			return 0, false, p.fail(start, "a whole number was expected as the power")
		}
		p.i = start
		return 0, false, nil
	}
	p.i = end
	n, err = strconv.Atoi(p.text[at:end])
	if err != nil || n > maxExponent || n < -maxExponent {
		return 0, false, p.fail(at, "the power %s is too large", p.text[at:end])
	}
	if closing && !p.has(")") || strings.HasPrefix(p.rest(), "/") && closing {
		return 0, false, p.fail(start, "only whole powers of units are read")
	}
	if rest := p.rest(); len(rest) > 1 && rest[0] == '.' && '0' <= rest[1] && rest[1] <= '9' {
		return 0, false, p.fail(start, "only whole powers of units are read")
	}
	return n, true, nil
}

// symbol reads the name of a unit.
func (p *parser) symbol() (entry, error) {
	start := p.i
	for p.i < len(p.text) && beginsSymbol(p.rest()) {
		_, n := utf8.DecodeRuneInString(p.rest())
		p.i += n
	}
	name := p.text[start:p.i]
	if name == "" {
		if p.i == len(p.text) {
			return entry{}, p.fail(start, "a unit is missing at the end")
		}
		if strings.Count(p.rest(), "'") > 1 {
			return entry{}, p.fail(start, "a unit in quotes is one nobody else knows; its size cannot be told")
		}
		if reason, ok := refused[p.next()]; ok {
			return entry{}, p.fail(start, "%s", reason)
		}
		return entry{}, p.fail(start, "a unit was expected, not %q", p.next())
	}
	if name == "h" && strings.TrimSpace(p.text) != "h" {
		return entry{}, p.fail(start, "%s", hubble)
	}
	if name == "%" && strings.TrimSpace(p.text) != "%" {
		return entry{}, p.fail(start, "%% stands alone: an error in percent, or a percentage of another unit, is not read")
	}
	if reason, ok := refused[name]; ok {
		return entry{}, p.fail(start, "%s: %s", name, reason)
	}
	if e, ok := lookup(name); ok {
		return e, nil
	}
	if near := Suggest(name); near != "" {
		return entry{}, p.fail(start, "the unit %q is not known; did you mean %q?", name, near)
	}
	return entry{}, p.fail(start, "the unit %q is not known (examples: kpc, arcmin, keV, cm**-3, km/s, solMass)", name)
}

// beginsSymbol reports whether a unit's name can begin or go on with the first
// character of the text.
func beginsSymbol(text string) bool {
	r, _ := utf8.DecodeRuneInString(text)
	return unicode.IsLetter(r) || r == '_' || r == '%' || r == '☉' || r == '⊙'
}
