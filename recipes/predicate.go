package recipes

import "errors"

// Predicate is a compiled `select`: a condition on the columns of a data file.
type Predicate struct {
	text  string
	names []string
}

// Text returns the condition as written.
func (p *Predicate) Text() string { return p.text }

// Names returns the columns the condition reads, by their names in the file,
// each once and in the order Keep takes their values.
func (p *Predicate) Names() []string { return p.names }

// Quantities returns those of Names that are compared with a quantity and so
// must be given a unit by Bind.
func (p *Predicate) Quantities() []string { return nil }

// Bind returns the predicate with its quantities converted to the units that
// unit gives for a column ("" where a column has none). Columns whose unit the
// recipe states are bound already and stay so where unit returns "".
func (p *Predicate) Bind(unit func(column string) string) (*Predicate, error) {
	return nil, errors.New("recipes: being written")
}

// Keep reports whether a row passes. The values stand in the order of Names and
// are float64 or string; NaN is a missing value, and a condition that depends
// on one is not fulfilled.
func (p *Predicate) Keep(values []any) (bool, error) {
	return false, errors.New("recipes: being written")
}
