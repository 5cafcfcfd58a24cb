package catalogue

import (
	"bufio"
	"encoding/binary"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"

	"steelyard/probes/units"
)

// OutColumn is one column to write: numbers, or Text instead.
type OutColumn struct {
	Name    string
	Unit    string // as units.Parse reads it; CSV has no place for it
	Values  []float64
	Text    []string
	Integer bool // write the numbers as whole numbers
}

// WriteCSV writes the columns under a line of names. Numbers are the shortest
// decimals that read back as themselves. Like the other writers it gives the
// same bytes for the same columns, leaves an old file alone when it fails, and
// refuses columns of unequal length, names given twice and numbers that are not
// finite.
func WriteCSV(path string, columns []OutColumn) error {
	return write(path, columns, func(w io.Writer, rows int) error {
		return writeRecords(csv.NewWriter(w), columns, rows)
	})
}

// WriteECSV writes the columns as ECSV, with units and types in the header.
func WriteECSV(path string, columns []OutColumn) error {
	return write(path, columns, func(w io.Writer, rows int) error {
		fmt.Fprintf(w, "%s 1.0\n# ---\n# delimiter: ','\n# datatype:\n", ecsvMark)
		for i := range columns {
			c := &columns[i]
			kind := "float64"
			switch {
			case c.Text != nil:
				kind = "string"
			case c.Integer:
				kind = "int64"
			}
			fmt.Fprintf(w, "# - {name: %s, ", yamlQuoted(c.Name))
			if c.Unit != "" {
				fmt.Fprintf(w, "unit: %s, ", yamlQuoted(c.Unit))
			}
			fmt.Fprintf(w, "datatype: %s}\n", kind)
		}
		fmt.Fprintf(w, "# schema: astropy-2.0\n")
		return writeRecords(csv.NewWriter(w), columns, rows)
	})
}

func yamlQuoted(text string) string { return "'" + strings.ReplaceAll(text, "'", "''") + "'" }

// writeRecords writes the line of names and the rows.
func writeRecords(w *csv.Writer, columns []OutColumn, rows int) error {
	record := make([]string, len(columns))
	for i := range columns {
		record[i] = columns[i].Name
	}
	if err := w.Write(record); err != nil {
		return err
	}
	for row := range rows {
		for i := range columns {
			switch c := &columns[i]; {
			case c.Text != nil:
				record[i] = c.Text[row]
			case c.Integer:
				record[i] = strconv.FormatInt(int64(c.Values[row]), 10)
			default:
				record[i] = strconv.FormatFloat(c.Values[row], 'g', -1, 64)
			}
		}
		if err := w.Write(record); err != nil {
			return err
		}
	}
	w.Flush()
	return w.Error()
}

// WriteFITS writes the columns as the only binary table of a FITS file, under
// the name given: doubles, 64-bit whole numbers, and texts as wide as the
// longest.
func WriteFITS(path, name string, columns []OutColumn) error {
	return write(path, columns, func(w io.Writer, rows int) error {
		primary := newCards()
		primary.value("SIMPLE", "T")
		primary.value("BITPIX", "8")
		primary.value("NAXIS", "0")
		primary.value("EXTEND", "T")
		if err := primary.flush(w); err != nil {
			return err
		}
		rowWidth := 0
		widths := make([]int, len(columns))
		for i := range columns {
			widths[i] = 8
			if texts := columns[i].Text; texts != nil {
				widths[i] = 1
				for _, t := range texts {
					widths[i] = max(widths[i], len(t))
				}
			}
			rowWidth += widths[i]
		}
		table := newCards()
		table.text("XTENSION", "BINTABLE")
		table.value("BITPIX", "8")
		table.value("NAXIS", "2")
		table.value("NAXIS1", strconv.Itoa(rowWidth))
		table.value("NAXIS2", strconv.Itoa(rows))
		table.value("PCOUNT", "0")
		table.value("GCOUNT", "1")
		table.value("TFIELDS", strconv.Itoa(len(columns)))
		for i := range columns {
			c, n := &columns[i], strconv.Itoa(i+1)
			table.text("TTYPE"+n, c.Name)
			switch {
			case c.Text != nil:
				table.text("TFORM"+n, strconv.Itoa(widths[i])+"A")
			case c.Integer:
				table.text("TFORM"+n, "K")
			default:
				table.text("TFORM"+n, "D")
			}
			if c.Unit != "" {
				table.text("TUNIT"+n, c.Unit)
			}
		}
		table.text("EXTNAME", name)
		if err := table.flush(w); err != nil {
			return err
		}
		return writeRows(w, columns, widths, rows, rowWidth)
	})
}

func writeRows(w io.Writer, columns []OutColumn, widths []int, rows, rowWidth int) error {
	row := make([]byte, 0, rowWidth)
	for r := range rows {
		row = row[:0]
		for i := range columns {
			switch c := &columns[i]; {
			case c.Text != nil:
				row = append(row, c.Text[r]...)
				row = append(row, make([]byte, widths[i]-len(c.Text[r]))...)
			case c.Integer:
				row = binary.BigEndian.AppendUint64(row, uint64(int64(c.Values[r])))
			default:
				row = binary.BigEndian.AppendUint64(row, math.Float64bits(c.Values[r]))
			}
		}
		if _, err := w.Write(row); err != nil {
			return err
		}
	}
	_, err := w.Write(make([]byte, padding(rows*rowWidth)))
	return err
}

func padding(n int) int { return (fitsBlock - n%fitsBlock) % fitsBlock }

// cards collects the cards of one FITS header.
type cards struct{ b strings.Builder }

func newCards() *cards { return &cards{} }

func (c *cards) value(name, value string) { fmt.Fprintf(&c.b, "%-8s= %20s%50s", name, value, "") }

func (c *cards) text(name, value string) {
	fmt.Fprintf(&c.b, "%-8s= %-70s", name, "'"+fmt.Sprintf("%-8s", strings.ReplaceAll(value, "'", "''"))+"'")
}

func (c *cards) flush(w io.Writer) error {
	fmt.Fprintf(&c.b, "%-80s", "END")
	c.b.WriteString(strings.Repeat(" ", padding(c.b.Len())))
	_, err := io.WriteString(w, c.b.String())
	return err
}

// write checks the columns and lets body write them to a file that takes the
// place of path when all went well.
func write(path string, columns []OutColumn, body func(w io.Writer, rows int) error) error {
	rows, err := check(columns)
	if err != nil {
		return fmt.Errorf("%s: %w", path, err)
	}
	f, err := os.CreateTemp(filepath.Dir(path), ".table-*")
	if err != nil {
		return err
	}
	defer os.Remove(f.Name()) // fails after the rename, as it should
	w := bufio.NewWriter(f)
	err = errors.Join(body(w, rows), w.Flush(), f.Chmod(0o644), f.Close())
	if err != nil {
		return err
	}
	return os.Rename(f.Name(), path)
}

// check returns the number of rows of columns that can be written.
func check(columns []OutColumn) (rows int, err error) {
	if len(columns) == 0 {
		return 0, problem("no columns to write")
	}
	seen := map[string]bool{}
	for i := range columns {
		c := &columns[i]
		n := len(c.Values)
		if c.Text != nil {
			n = len(c.Text)
		}
		if i == 0 {
			rows = n
		}
		switch {
		case n != rows:
			return 0, problem("column %q has %d values, the first column %d", c.Name, n, rows)
		case c.Text != nil && c.Values != nil:
			return 0, problem("column %q has both numbers and texts", c.Name)
		case !plain(c.Name) || c.Name == "" || len(c.Name) > 60:
			return 0, problem("the column name %q is not plain text of up to 60 characters", c.Name)
		case seen[c.Name]:
			return 0, problem("two columns are named %q", c.Name)
		}
		seen[c.Name] = true
		if _, err := units.Parse(c.Unit); err != nil {
			return 0, err
		}
		for row, x := range c.Values {
			if math.IsNaN(x) || math.IsInf(x, 0) || c.Integer && (x != math.Trunc(x) || math.Abs(x) > 1<<53) {
				return 0, problem("row %d of column %q is %v, which cannot be written", row+1, c.Name, x)
			}
		}
		for row, t := range c.Text {
			if !plain(t) {
				return 0, problem("row %d of column %q is %q, which is not plain text", row+1, c.Name, t)
			}
		}
	}
	return rows, nil
}

// plain reports whether the text is printable ASCII without blanks at its ends,
// and does not begin a comment.
func plain(text string) bool {
	for i := range len(text) {
		if text[i] < ' ' || text[i] > '~' {
			return false
		}
	}
	return strings.TrimSpace(text) == text && !strings.HasPrefix(text, "#")
}
