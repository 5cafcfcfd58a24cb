package catalogue

import (
	"bufio"
	"encoding/csv"
	"errors"
	"io"
	"regexp"
	"strings"
	"unicode/utf8"

	"steelyard/probes/units"
)

// textTable reads the rows of a text table.
type textTable struct {
	layout  *layout
	content io.ReadSeeker
	csv     *csv.Reader // for a delimiter
	guard   *guard      // under csv
	lines   *lineReader // for blanks
	fields  []string
	at      int // line of the current row
}

// newTextTable goes to the first row of the content.
func newTextTable(content io.ReadSeeker, l *layout) (*textTable, error) {
	if _, err := content.Seek(0, io.SeekStart); err != nil {
		return nil, err
	}
	t := &textTable{layout: l, content: content, lines: newLineReader(content)}
	for range l.skip {
		if _, err := t.lines.read(); err != nil {
			return nil, err
		}
	}
	if l.delimiter != blanks {
		t.guard = &guard{r: t.lines.r, left: maxLine}
		t.csv = newCSV(t.guard, l.delimiter)
	}
	return t, nil
}

func (t *textTable) header() *Header {
	return &Header{Format: t.layout.format, Columns: t.layout.columns}
}

func (t *textTable) count() int { return -1 }
func (t *textTable) line() int  { return t.at }

func (t *textTable) close() {
	if c, ok := t.content.(io.Closer); ok {
		c.Close()
	}
}

func (t *textTable) next() (bool, error) {
	for {
		err := t.record()
		if err == io.EOF {
			return false, nil
		}
		if err != nil {
			return false, err
		}
		switch n := len(t.layout.columns); {
		case len(t.fields) == n:
			return true, nil
		case len(t.fields) == 0 || len(t.fields) == 1 && strings.TrimSpace(t.fields[0]) == "":
			continue // a line of blanks
		default:
			return false, problem("the row has %s, but the header names %s", counted(len(t.fields), "value"), counted(n, "column"))
		}
	}
}

// record reads the next line that is not empty or a comment into t.fields.
func (t *textTable) record() (err error) {
	if t.csv != nil {
		t.guard.left = maxLine
		t.fields, err = t.csv.Read()
		if err != nil {
			var parse *csv.ParseError
			if errors.As(err, &parse) {
				t.at = t.layout.skip + parse.StartLine
			}
			return csvProblem(err)
		}
		line, _ := t.csv.FieldPos(0)
		t.at = t.layout.skip + line
		return nil
	}
	for {
		line, err := t.lines.read()
		if err != nil {
			return err
		}
		t.at = t.lines.count
		if text := strings.TrimSpace(line); text == "" || text[0] == '#' {
			continue
		}
		t.fields, err = splitBlanks(t.fields[:0], line)
		return err
	}
}

// cell returns a field of the current row without the blanks around it.
func (t *textTable) cell(column int) string { return strings.TrimSpace(t.fields[column]) }

func (t *textTable) text(column int) (string, error) {
	cell := t.cell(column)
	if !utf8.ValidString(cell) {
		return "", problem("holds %s, which is not UTF-8 text; save the file as UTF-8", shown(cell))
	}
	return cell, nil
}

func (t *textTable) number(column int, c *units.Converter) (float64, error) {
	cell := t.cell(column)
	if x, err := c.Decimal(cell); err == nil {
		return x, nil
	} else if errors.Is(err, units.ErrRange) {
		return 0, problem("holds %s, %v", shown(cell), err)
	}
	if isMissing(cell) {
		if cell == "" {
			return 0, missing("is empty; a number is expected in every row")
		}
		return 0, missing("holds " + shown(cell) + "; a number is expected in every row")
	}
	if t.layout.logical != nil && t.layout.logical[column] {
		switch cell {
		case "True":
			return c.Float(1)
		case "False":
			return c.Float(0)
		}
	}
	return 0, problem("holds %s, which is not a number%s", shown(cell), hint(cell))
}

// isMissing reports whether the cell is one of the ways to write that there is
// no value.
func isMissing(cell string) bool {
	switch strings.ToLower(cell) {
	case "", "nan", "+nan", "-nan", "null", "none", "na", "n/a", "-", "--", "---", "...", "masked":
		return true
	}
	return false
}

var (
	sexagesimal  = regexp.MustCompile(`^[+-]?\d{1,3}([:hd°]|\s)\s*\d{1,2}`)
	decimalComma = regexp.MustCompile(`^[+-]?\d+,\d+([eE][+-]?\d+)?$`)
	fortran      = regexp.MustCompile(`^[+-]?\d*\.?\d*[dD][+-]?\d+$`)
)

// hint says what a cell that is not a number may have been meant to be.
func hint(cell string) string {
	_, unitErr := units.Parse(cell)
	switch {
	case sexagesimal.MatchString(cell):
		return "; sexagesimal coordinates are not read from tables: give decimal degrees, with the unit deg"
	case decimalComma.MatchString(cell):
		return "; write decimals with a point"
	case fortran.MatchString(cell):
		return "; write the exponent with e"
	case strings.HasPrefix(strings.TrimLeft(strings.ToLower(cell), "+-"), "inf"):
		return " but an infinity; leave the row out"
	case unitErr == nil:
		return "; if this is a line of units, begin it with # and state the units in the recipe"
	}
	return ""
}

// guard lets a bounded number of bytes through between two records.
type guard struct {
	r    *bufio.Reader
	left int
}

func (g *guard) Read(p []byte) (int, error) {
	if g.left <= 0 {
		return 0, errLongLine
	}
	n, err := g.r.Read(p[:min(len(p), g.left)])
	g.left -= n
	return n, err
}
