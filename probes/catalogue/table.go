// Package catalogue reads tables of measurements from the files astronomers
// keep them in, into columns with units.
package catalogue

// Column is one column of numbers, in the canonical unit it was asked in.
type Column struct {
	Name   string    // the role in the recipe: "inner", "ra"
	Unit   string    // canonical unit: "kpc" or "rad" for a length that was given as an angle, …
	Values []float64 // finite
	Text   []string  // instead of Values, for a column of names
}

// Table is a set of columns of equal length. Rows holds, for every row, its
// number in the file (counted from 1, headers not counted), so that messages
// can point at the file after rows were selected.
type Table struct {
	File    string // as written in the recipe, for messages
	Rows    []int
	Columns []Column
}

// Len returns the number of rows.
func (t *Table) Len() int { return len(t.Rows) }

// Column returns the named column, or nil when the table has none.
func (t *Table) Column(name string) *Column {
	for i := range t.Columns {
		if t.Columns[i].Name == name {
			return &t.Columns[i]
		}
	}
	return nil
}

// Values returns the numbers of the named column, or nil when there is none.
func (t *Table) Values(name string) []float64 {
	if c := t.Column(name); c != nil {
		return c.Values
	}
	return nil
}
