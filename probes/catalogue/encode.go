package catalogue

import (
	"fmt"

	"steelyard/probes/wire"
)

// format names the encoding of a table.
const format = "steelyard table 1"

// MarshalBinary encodes the table; equal tables give equal bytes.
func (t *Table) MarshalBinary() ([]byte, error) {
	e := wire.NewEncoder(format, 8*len(t.Rows)*(len(t.Columns)+1))
	e.Text(t.File)
	e.Ints(t.Rows)
	e.Int(len(t.Columns))
	for _, c := range t.Columns {
		if n := len(c.Values) + len(c.Text); n != len(t.Rows) {
			return nil, fmt.Errorf("catalogue: column %q has %d rows, the table %d", c.Name, n, len(t.Rows))
		}
		e.Text(c.Name)
		e.Text(c.Unit)
		e.Floats(c.Values)
		e.Texts(c.Text)
	}
	return *e, nil
}

// UnmarshalBinary decodes what MarshalBinary wrote and refuses anything else.
func (t *Table) UnmarshalBinary(data []byte) error {
	d := wire.NewDecoder(format, data)
	got := Table{File: d.Text(), Rows: d.Ints()}
	for n := d.Count(16); n > 0 && !d.Failed(); n-- {
		c := Column{Name: d.Text(), Unit: d.Text(), Values: d.Floats(), Text: d.Texts()}
		if len(c.Values)+len(c.Text) != len(got.Rows) && !d.Failed() {
			return fmt.Errorf("catalogue: column %q has another length than the table", c.Name)
		}
		got.Columns = append(got.Columns, c)
	}
	if err := d.Close(); err != nil {
		return fmt.Errorf("catalogue: %w", err)
	}
	*t = got
	return nil
}

// Pick returns the table with the given rows only, by index.
func (t *Table) Pick(rows []int) *Table {
	out := &Table{File: t.File, Rows: make([]int, len(rows)), Columns: make([]Column, len(t.Columns))}
	for k, i := range rows {
		out.Rows[k] = t.Rows[i]
	}
	for c, col := range t.Columns {
		out.Columns[c] = Column{Name: col.Name, Unit: col.Unit}
		if col.Text != nil {
			out.Columns[c].Text = make([]string, len(rows))
			for k, i := range rows {
				out.Columns[c].Text[k] = col.Text[i]
			}
			continue
		}
		out.Columns[c].Values = make([]float64, len(rows))
		for k, i := range rows {
			out.Columns[c].Values[k] = col.Values[i]
		}
	}
	return out
}
