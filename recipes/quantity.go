package recipes

import (
	"errors"
	"fmt"
	"math/big"

	"github.com/hashicorp/hcl/v2"

	"steelyard/probes/units"
)

// measure says what a number counts: the canonical unit, "" for a pure number,
// and whether an angle may stand for a length or a length for an angle.
type measure struct {
	unit   string
	length bool
}

var pure = measure{}

// scalar is one number in a canonical unit, with the errors it may have.
type scalar struct {
	value       float64
	minus, plus float64 // 0 for none
	unit        string
	bare        bool // a zero without a unit, which goes with every unit
}

// canonical lists the units the program computes in, for quantities of which
// nothing but their own unit is known.
var canonical = []string{"kpc", "rad", "solMass", "km/s", "keV", "cm**-3", "km/s/Mpc", "K", "solLum", "m/s**2"}

// examples shows a quantity of each kind.
var examples = map[string]string{
	"kpc": "1.5 Mpc", "rad": "3 arcmin", "solMass": "5e14 solMass", "km/s": "900 km/s", "keV": "6.5 keV", "cm**-3": "1e-3 cm**-3",
	"km/s/Mpc": "70 km/s/Mpc", "K": "2.7255 K", "solLum": "1e12 solLum", "m/s**2": "1.2e-10 m/s**2",
}

// standard returns the canonical unit of the same dimension, else the unit
// itself.
func standard(u units.Unit) string {
	if u.IsPure() {
		return ""
	}
	for _, name := range canonical {
		if units.SameDimension(u, units.MustParse(name)) {
			return name
		}
	}
	if _, err := units.Parse(u.String()); err != nil { // too long when written out
		return ""
	}
	return u.String()
}

// measuredExamples shows a quantity of each kind with its error.
var measuredExamples = map[string]string{
	"kpc": "1.5 +- 0.1 Mpc", "rad": "18.4 +- 0.6 arcsec", "solMass": "6.1 +- 0.8 10**14 solMass", "km/s": "970 +- 30 km/s", "keV": "6.5 +- 0.4 keV",
}

// example returns a quantity of the measure as a recipe writes it.
func (m measure) example() string {
	if m.unit == "" {
		return "0.3"
	}
	if text, ok := examples[standard(units.MustParse(m.unit))]; ok {
		return `"` + text + `"`
	}
	return `"1 ` + m.unit + `"`
}

// describe names the measure: "a length", "a pure number".
func (m measure) describe() string {
	text := withArticle(units.MustParse(m.unit).Describe())
	if m.length {
		text += " or " + map[bool]string{true: "an angle", false: "a length"}[units.MustParse(m.unit).IsLength()]
	}
	return text
}

func withArticle(noun string) string {
	switch noun[0] {
	case 'a', 'e', 'i', 'o', 'u':
		return "an " + noun
	}
	return "a " + noun
}

// fits returns the canonical unit in which a quantity of the unit is taken.
func (m measure) fits(u units.Unit) (unit string, ok bool) {
	want := units.MustParse(m.unit)
	switch {
	case units.SameDimension(u, want):
		return m.unit, true
	case m.length && want.IsLength() && u.IsAngle():
		return "rad", true
	case m.length && want.IsAngle() && u.IsLength():
		return "kpc", true
	}
	return "", false
}

// scalar reads a number or a quantity. The name is the setting's, for messages.
func (l *loader) scalar(t term, m measure, name string) (scalar, bool) {
	switch t.kind {
	case badTerm:
		return scalar{}, false
	case numberTerm:
		x := float(t.number)
		if m.unit != "" && x != 0 {
			l.add(problem{at: t.at, what: fmt.Sprintf("%s needs a unit", name),
				why: "A number alone does not say in which unit it is.", write: "Write it like " + m.example() + "."})
			return scalar{}, false
		}
		return scalar{value: x, unit: m.unit, bare: m.unit != ""}, true
	case textTerm:
		return l.quantity(t, m, name)
	case referenceTerm:
		return l.objectNumber(t, m, name)
	case callTerm:
		if priorArguments[t.name] != nil {
			l.add(problem{at: t.at, what: fmt.Sprintf("%s is an exact number: it takes no prior", name), write: "Write it like " + m.example() + "."})
			return scalar{}, false
		}
	}
	l.add(problem{at: t.at, what: fmt.Sprintf("%s is %s, not %s", name, m.describe(), t.describe()), write: "Write it like " + m.example() + "."})
	return scalar{}, false
}

// quantity reads the text of a quantity.
func (l *loader) quantity(t term, m measure, name string) (scalar, bool) {
	q, err := units.ParseQuantity(t.text)
	if err != nil {
		l.unitError(t, err, fmt.Sprintf("%s cannot be read", name))
		return scalar{}, false
	}
	unit, ok := m.fits(q.Unit)
	if !ok {
		p := problem{at: t.at, what: fmt.Sprintf("%s is %s, not %s", name, m.describe(), withArticle(q.Unit.Describe())), write: "Write it like " + m.example() + "."}
		if !q.HasUnit {
			p.what = fmt.Sprintf("%s needs a unit", name)
			p.why = "A number alone does not say in which unit it is."
		}
		l.add(p)
		return scalar{}, false
	}
	s := scalar{unit: unit}
	if s.value, s.minus, s.plus, err = q.In(units.MustParse(unit)); err != nil {
		l.fail(t.at, "%s cannot be converted: %v", name, err)
		return scalar{}, false
	}
	s.value += 0 // −0 is 0
	return s, true
}

// unitError reports a mistake inside the text of a quantity or a unit, at its
// place.
func (l *loader) unitError(t term, err error, what string) {
	p := problem{at: t.at, what: what, why: sentence(err.Error())}
	var e *units.Error
	if errors.As(err, &e) {
		p.why = sentence(e.Reason)
		if raw := l.written(t.inside); raw == t.text && e.Text == t.text && e.Offset < len(raw) {
			p.at = l.part(t.inside, e.Offset, len(raw))
		}
	}
	l.add(p)
}

// part returns the place from one byte to another of a place.
func (r *report) part(at hcl.Range, from, to int) hcl.Range {
	t := r.texts[at.Filename]
	start := at.Start.Byte
	return hcl.Range{Filename: at.Filename, Start: t.place(start + from), End: t.place(start + to)}
}

// exactScalar reads a number or a quantity without an error.
func (l *loader) exactScalar(t term, m measure, name string) (scalar, bool) {
	s, ok := l.scalar(t, m, name)
	if ok && s.plus > 0 {
		l.add(problem{at: t.at, what: fmt.Sprintf("%s is an exact number: it takes no error", name), write: "Write the value alone, like " + m.example() + "."})
		return s, false
	}
	return s, ok
}

// objectNumber resolves the one reference that stands for a plain number.
func (l *loader) objectNumber(t term, m measure, name string) (scalar, bool) {
	if len(t.path) == 2 && t.path[0] == "object" && t.path[1] == "redshift" {
		if m.unit != "" {
			l.add(problem{at: t.at, what: fmt.Sprintf("%s is %s, not a redshift", name, m.describe()), write: "Write it like " + m.example() + "."})
			return scalar{}, false
		}
		return scalar{value: l.recipe.Object.Redshift}, l.recipe.Object.Redshift > 0
	}
	p := problem{at: t.at, what: fmt.Sprintf("%s is %s, and %s is none", name, m.describe(), t.describe()), write: "Write it like " + m.example() + "."}
	switch {
	case t.path[0] == "nuisance":
		p.what = fmt.Sprintf("%s is an exact number: it cannot be a nuisance", name)
	case t.path[0] == "object":
		p.what, p.write = fmt.Sprintf("%s is nothing that can be referred to", t.describe()), "Of the object, object.redshift can be referred to."
	}
	l.add(p)
	return scalar{}, false
}

// float rounds an exact number once; −0 is 0.
func float(x *big.Rat) float64 {
	f, _ := x.Float64()
	return f + 0
}
