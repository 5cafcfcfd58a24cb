package catalogue

import (
	"errors"
	"fmt"
	"math"
	"strings"

	"steelyard/probes/units"
)

// Want is one column to read.
type Want struct {
	Role   string // name in the returned table
	Name   string // name in the file
	Unit   string // unit stated by the recipe; "" takes the file's
	As     string // canonical unit to convert to ("kpc", "keV", …); "" for a pure number
	Length bool   // As is kpc and an angle may stand instead, which yields "rad"
	Text   bool   // read as text
	Raw    bool   // no conversion: numbers as the file has them (for select)
	Blank  bool   // a missing value is allowed and yields NaN (for columns used only in select)
}

// Filter decides which rows to keep from the raw values of the columns it
// names, in that order. Numeric columns arrive as float64, text as string; a
// missing value is NaN or "". The slice is used again for the next row.
type Filter struct {
	Names []string
	Keep  func(values []any) (bool, error)
}

// Limits bounds what a file may ask of memory. The zero value means the
// defaults stated at each field.
type Limits struct {
	Rows  int   // 50 million
	Bytes int64 // 2 GiB of decoded columns
}

// Read reads the wanted columns of the rows that pass the filter (nil keeps
// all). The format is recognised by content, the name only helps: CSV (also
// with semicolons or tabs), blank-separated text, ECSV, FITS binary tables.
//
// A number is multiplied by the exact factor of its unit and rounded once. In a
// text file it is the decimal that is written; a double of a FITS table counts
// as the shortest decimal that reads back as it, so that one table gives the
// same digits in every format; single precision is taken as it is.
//
// Every number of the result is finite, NaN only where Want.Blank allows it.
// Errors are *Error, several of them joined when columns or units are wrong.
func Read(path string, want []Want, filter *Filter, limits Limits) (*Table, error) {
	if limits.Rows <= 0 {
		limits.Rows = 50_000_000
	}
	if limits.Bytes <= 0 {
		limits.Bytes = 2 << 30
	}
	names := make([]string, 0, len(want))
	for _, w := range want {
		names = append(names, w.Name)
	}
	if filter != nil {
		names = append(names, filter.Names...)
	}
	src, err := open(path, names)
	if err != nil {
		return nil, at(path, err)
	}
	defer src.close()
	plans, err := resolve(src.header(), want, filter)
	if err != nil {
		return nil, at(path, err)
	}
	t, err := gather(src, plans, filter, limits)
	if err != nil {
		return nil, at(path, err)
	}
	t.File = path
	return t, nil
}

// at names the file in every Error inside err, and makes an Error of any other.
func at(path string, err error) error {
	if joined, ok := err.(interface{ Unwrap() []error }); ok {
		for _, e := range joined.Unwrap() {
			at(path, e)
		}
		return err
	}
	var e *Error
	if errors.As(err, &e) {
		e.File = path
		return e
	}
	return &Error{File: path, Reason: err.Error(), Err: err}
}

// source is an open table of any format, read row by row.
type source interface {
	header() *Header
	count() int          // number of rows, -1 when not known beforehand
	next() (bool, error) // steps to the next row; false at the end
	line() int           // of the current row in a text file, else 0

	// number returns a cell of the current row, converted. A missing value is
	// an error of type missing.
	number(column int, c *units.Converter) (float64, error)
	// text returns a cell of the current row as text, "" for a missing value.
	text(column int) (string, error)

	close()
}

// gather runs over the rows and collects what the plans ask for.
func gather(src source, plans *plans, filter *Filter, limits Limits) (*Table, error) {
	t := &Table{Columns: make([]Column, len(plans.columns))}
	rowBytes := int64(8)
	for i, p := range plans.columns {
		t.Columns[i].Name, t.Columns[i].Unit = p.want.Role, p.unit
		if p.want.Text {
			rowBytes += 16
		} else {
			rowBytes += 8
		}
	}
	if n := src.count(); n >= 0 && filter == nil {
		if n > limits.Rows {
			return nil, tooManyRows(limits)
		}
		if int64(n) > limits.Bytes/rowBytes {
			return nil, tooManyBytes(limits)
		}
		t.Rows = make([]int, 0, n)
		for i, p := range plans.columns {
			if !p.want.Text {
				t.Columns[i].Values = make([]float64, 0, n)
			}
		}
	}
	row, bytes := 0, int64(0)
	for {
		more, err := src.next()
		if err != nil {
			return nil, place(err, row+1, src.line(), "")
		}
		if !more {
			break
		}
		row++
		if row > limits.Rows {
			return nil, tooManyRows(limits)
		}
		if filter != nil {
			keep, err := plans.keep(src, filter)
			if err != nil {
				return nil, place(err, row, src.line(), "")
			}
			if !keep {
				continue
			}
		}
		bytes += rowBytes
		t.Rows = append(t.Rows, row)
		for i := range plans.columns {
			p := &plans.columns[i]
			n, err := p.append(&t.Columns[i], src)
			if err != nil {
				return nil, place(err, row, src.line(), p.want.Name)
			}
			bytes += n
		}
		if bytes > limits.Bytes {
			return nil, tooManyBytes(limits)
		}
	}
	switch {
	case row == 0:
		return nil, problem("the table has no rows")
	case len(t.Rows) == 0:
		return nil, problem("none of the %d rows passes the selection", row)
	}
	return t, nil
}

// append reads the column's cell of the current row and returns how many bytes
// of text it keeps.
func (p *plan) append(c *Column, src source) (int64, error) {
	if p.want.Text {
		text, err := src.text(p.index)
		if err != nil {
			return 0, err
		}
		if text == "" && !p.want.Blank {
			return 0, missing("is empty; a name is expected in every row")
		}
		c.Text = append(c.Text, strings.Clone(text))
		return int64(len(text)), nil
	}
	x, err := src.number(p.index, p.converter)
	if err != nil {
		var m missing
		if !errors.As(err, &m) || !p.want.Blank {
			return 0, err
		}
		x = math.NaN()
	}
	c.Values = append(c.Values, x)
	return 0, nil
}

// keep asks the filter about the current row.
func (p *plans) keep(src source, filter *Filter) (bool, error) {
	for i, f := range p.filter {
		if f.isText {
			text, err := src.text(f.index)
			if err != nil {
				return false, place(err, 0, 0, f.name)
			}
			p.values[i] = text
			continue
		}
		x, err := src.number(f.index, p.identity)
		if err != nil {
			var m missing
			if !errors.As(err, &m) {
				return false, place(err, 0, 0, f.name)
			}
			x = math.NaN()
		}
		p.values[i] = x
	}
	return filter.Keep(p.values)
}

// place says where in the file an error is, unless it knows already.
func place(err error, row, line int, column string) error {
	e, ok := err.(*Error)
	if !ok {
		e = &Error{Reason: err.Error(), Err: err}
	}
	if e.Row == 0 {
		e.Row = row
	}
	if e.Line == 0 {
		e.Line = line
	}
	if e.Column == "" {
		e.Column = column
	}
	return e
}

func tooManyRows(l Limits) error {
	return problem("the table has more than %d rows, which is the limit", l.Rows)
}

func tooManyBytes(l Limits) error {
	return problem("the wanted columns take more than %s, which is the limit", size(l.Bytes))
}

// size writes a number of bytes for people.
func size(n int64) string {
	switch {
	case n >= 1<<30:
		return fmt.Sprintf("%.3g GiB", float64(n)/(1<<30))
	case n >= 1<<20:
		return fmt.Sprintf("%.3g MiB", float64(n)/(1<<20))
	}
	return fmt.Sprintf("%d bytes", n)
}
