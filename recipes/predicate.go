package recipes

import (
	"fmt"
	"math"
	"slices"

	"steelyard/probes/units"
)

// Predicate is a compiled `select`: a condition on the columns of a data file.
// It is safe for concurrent use.
type Predicate struct {
	text       string
	names      []string
	quantities []quantity
	bound      []float64 // the quantities in the units of their columns; nil before Bind
	distance   float64   // kpc, 0 when not given
	test       condition
}

// quantity is a quantity that some column is compared with.
type quantity struct {
	column int // index into names
	text   string
	value  units.Quantity
	unit   string // of the column, as far as the recipe states it
	apart  bool   // whether that unit is of length and the quantity's of angle, or the other way round
}

// row is what a condition is evaluated on: the values of the columns and the
// bound quantities.
type row struct {
	values     []any
	quantities []float64
}

// truth is a condition's outcome. It is unknown where it depends on a missing
// value.
type truth uint8

const (
	no truth = iota
	yes
	unknown
)

type (
	condition func(row) (truth, error)
	number    func(row) (float64, error)
)

// Text returns the condition as written.
func (p *Predicate) Text() string { return p.text }

// Names returns the columns the condition reads, by their names in the file,
// each once and in the order Keep takes their values.
func (p *Predicate) Names() []string { return p.names }

// Quantities returns those of Names that are compared with a quantity that is
// not converted yet: the recipe does not state their unit, or a length is
// compared with an angle. They need Bind.
func (p *Predicate) Quantities() []string {
	var names []string
	for _, q := range p.quantities {
		if name := p.names[q.column]; p.bound == nil && (q.unit == "" || q.apart) && !slices.Contains(names, name) {
			names = append(names, name)
		}
	}
	return names
}

// WithDistance returns the predicate for an object at an angular-diameter
// distance in kpc, with which Bind converts lengths to angles and back.
func (p *Predicate) WithDistance(kpc float64) *Predicate {
	b := *p
	b.distance = kpc
	return &b
}

// Bind returns the predicate with its quantities converted to the units that
// unit gives for a column ("" where a column has none). A unit that the recipe
// states goes before.
func (p *Predicate) Bind(unit func(column string) string) (*Predicate, error) {
	b := *p
	b.bound = make([]float64, len(p.quantities))
	for i, q := range p.quantities {
		name := p.names[q.column]
		if q.unit == "" {
			q.unit = unit(name)
		}
		if q.unit == "" {
			return nil, fmt.Errorf("select: the column %s is compared with %q and has no unit: state it in the file or in the recipe, or compare with a plain number", name, q.text)
		}
		u, err := units.Parse(q.unit)
		if err != nil {
			return nil, fmt.Errorf("select: the unit of the column %s: %w", name, err)
		}
		if b.bound[i], err = q.in(u, p.distance); err != nil {
			return nil, fmt.Errorf("select: the column %s is compared with %q: %w", name, q.text, err)
		}
	}
	return &b, nil
}

// apart reports whether one of two units is of length and the other of angle.
func apart(a, b units.Unit) bool {
	return a.IsLength() && b.IsAngle() || a.IsAngle() && b.IsLength()
}

// in converts a quantity to a unit, an angle to a length and back with the
// distance in kpc, 0 for one that is not known.
func (q quantity) in(u units.Unit, distance float64) (float64, error) {
	if !apart(q.value.Unit, u) {
		x, _, _, err := q.value.In(u)
		return x, err
	}
	if distance <= 0 {
		return 0, fmt.Errorf("an angle and a length can only be compared at a known distance")
	}
	here, there, factor := units.MustParse("rad"), units.MustParse("kpc"), distance
	if q.value.Unit.IsLength() {
		here, there, factor = there, here, 1/distance
	}
	x, _, _, err := q.value.In(here)
	if err != nil {
		return 0, err
	}
	return units.Convert(x*factor, there, u)
}

// Keep reports whether a row passes. The values stand in the order of Names and
// are float64 or string. NaN is a missing value: a condition whose outcome
// depends on one is not fulfilled, and neither is its negation. So is a
// division by zero.
func (p *Predicate) Keep(values []any) (bool, error) {
	if len(values) != len(p.names) {
		return false, fmt.Errorf("select: %d values for %d columns", len(values), len(p.names))
	}
	if len(p.bound) != len(p.quantities) {
		return false, fmt.Errorf("select: the columns %q are compared with quantities and their units were not given", p.Quantities())
	}
	t, err := p.test(row{values, p.bound})
	return t == yes, err
}

// columnNumber reads a column that must hold numbers.
func columnNumber(i int, name string) number {
	return func(r row) (float64, error) {
		if x, ok := r.values[i].(float64); ok {
			return x, nil
		}
		return 0, fmt.Errorf("select: the column %s holds text (%q here), which is no number", name, fmt.Sprint(r.values[i]))
	}
}

// columnText compares a column that must hold texts.
func columnText(i int, name, text string, equal bool) condition {
	return func(r row) (truth, error) {
		s, ok := r.values[i].(string)
		if !ok {
			return no, fmt.Errorf("select: the column %s holds numbers; compare it with a number instead of the text %q", name, text)
		}
		return truthOf((s == text) == equal), nil
	}
}

// columnsEqual compares two columns, both of numbers or both of texts.
func columnsEqual(i, j int, iName, jName string, equal bool) condition {
	return func(r row) (truth, error) {
		a, aText := r.values[i].(string)
		b, bText := r.values[j].(string)
		if aText && bText {
			return truthOf((a == b) == equal), nil
		}
		x, xNumber := r.values[i].(float64)
		y, yNumber := r.values[j].(float64)
		if !xNumber || !yNumber {
			return no, fmt.Errorf("select: one of the columns %s and %s holds texts and the other numbers", iName, jName)
		}
		if math.IsNaN(x) || math.IsNaN(y) {
			return unknown, nil
		}
		return truthOf((x == y) == equal), nil
	}
}

// compare compares two numbers.
func compare(a, b number, holds func(x, y float64) bool) condition {
	return func(r row) (truth, error) {
		x, err := a(r)
		if err != nil {
			return no, err
		}
		y, err := b(r)
		if err != nil {
			return no, err
		}
		if math.IsNaN(x) || math.IsNaN(y) {
			return unknown, nil
		}
		return truthOf(holds(x, y)), nil
	}
}

// calculate joins two numbers. A result that is not finite is a missing value.
func calculate(a, b number, f func(x, y float64) float64) number {
	return func(r row) (float64, error) {
		x, err := a(r)
		if err != nil {
			return 0, err
		}
		y, err := b(r)
		if err != nil {
			return 0, err
		}
		if z := f(x, y); !math.IsInf(z, 0) {
			return z, nil
		}
		return math.NaN(), nil
	}
}

func negate(a number) number {
	return func(r row) (float64, error) {
		x, err := a(r)
		return -x, err
	}
}

// both, either and opposite are the logic of three values: what an unknown
// could not change is known.
func both(a, b condition) condition {
	return func(r row) (truth, error) {
		x, err := a(r)
		if err != nil || x == no {
			return no, err
		}
		y, err := b(r)
		if err != nil || y == no {
			return no, err
		}
		return max(x, y), nil
	}
}

func either(a, b condition) condition {
	return func(r row) (truth, error) {
		x, err := a(r)
		if err != nil || x == yes {
			return x, err
		}
		y, err := b(r)
		if err != nil || y == yes {
			return y, err
		}
		return max(x, y), nil
	}
}

func opposite(a condition) condition {
	return func(r row) (truth, error) {
		x, err := a(r)
		switch x {
		case no:
			x = yes
		case yes:
			x = no
		}
		return x, err
	}
}

func truthOf(b bool) truth {
	if b {
		return yes
	}
	return no
}
