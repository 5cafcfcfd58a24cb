package catalogue

import (
	"bufio"
	"fmt"
	"io"
	"strings"

	"steelyard/probes/units"
)

// fitsTable reads the rows of a FITS binary table (FITS standard 4.0, section
// 7.3), one after another through a buffer.
type fitsTable struct {
	content io.ReadSeeker
	name    string // EXTNAME
	columns []fitsColumn
	offset  int64 // of the first row in the content
	width   int   // bytes of one row
	rows    int
	done    int
	r       *bufio.Reader
	row     []byte
}

// openFITS returns the first binary table that has all the named columns.
func openFITS(content io.ReadSeeker, size int64, names []string) (source, error) {
	var first *fitsTable
	var seen []string
	position := int64(0)
	for {
		if _, err := content.Seek(position, io.SeekStart); err != nil {
			return nil, err
		}
		h, err := readFITSHeader(content)
		if err == io.EOF {
			break
		}
		if err != nil {
			if first != nil && position > first.offset {
				break // what follows the tables, perhaps padding that is not FITS
			}
			return nil, err
		}
		data, err := content.Seek(0, io.SeekCurrent)
		if err != nil {
			return nil, err
		}
		bytes, axes, err := h.dataSize()
		if err != nil {
			return nil, err
		}
		switch kind := h["XTENSION"]; kind {
		case "BINTABLE":
			t, err := newFITSTable(content, h, axes, data, size)
			if err != nil {
				return nil, err
			}
			if t.hasAll(names) {
				return t, t.rewind()
			}
			if first == nil {
				first = t
			}
			seen = append(seen, t.title(len(seen)+1))
		case "TABLE":
			seen = append(seen, "an ASCII table, which is not read; convert it to a binary table")
		}
		if bytes > size-data {
			break // cut short; what was wanted is not in front of it
		}
		position = data + (bytes+fitsBlock-1)/fitsBlock*fitsBlock
		if position >= size {
			break
		}
	}
	if first == nil {
		if len(seen) > 0 {
			return nil, problem("the FITS file holds no binary table, only %s", seen[0])
		}
		return nil, problem("the FITS file holds no binary table")
	}
	if len(seen) > 1 {
		return nil, problem("none of the tables in this FITS file has all the columns %s; the tables are: %s", strings.Join(names, ", "), strings.Join(seen, "; "))
	}
	return first, first.rewind() // resolve says what is missing
}

func newFITSTable(content io.ReadSeeker, h fitsHeader, axes []int64, offset, size int64) (*fitsTable, error) {
	if len(axes) != 2 {
		return nil, problem("a FITS binary table must have two axes, not %d", len(axes))
	}
	width, rows := axes[0], axes[1]
	if width == 0 && rows > 0 || multiply(width, rows) > size-offset {
		return nil, problem("the FITS header announces %d rows of %d bytes, but only %d bytes follow it; the file is cut short or damaged", rows, width, size-offset)
	}
	if h["ZTABLE"] == "T" {
		return nil, problem("a compressed FITS table, which is not read; unpack it first (funpack)")
	}
	fields, err := h.size("TFIELDS", -1)
	if err != nil {
		return nil, err
	}
	if fields > 999 {
		return nil, problem("the FITS keyword TFIELDS is %d; it cannot be above 999", fields)
	}
	t := &fitsTable{content: content, name: h["EXTNAME"], offset: offset, width: int(width), rows: int(rows)}
	at := int64(0)
	for i := range int(fields) {
		c, bytes, err := newFITSColumn(h, i+1)
		if err != nil {
			return nil, err
		}
		if bytes > width-at {
			return nil, problem("the columns of the FITS table are wider than its rows of %d bytes (TFORM%d)", width, i+1)
		}
		c.offset = int(at)
		at += bytes
		t.columns = append(t.columns, c)
	}
	if at != width {
		return nil, problem("the columns of the FITS table take %d bytes, its rows %d", at, width)
	}
	return t, nil
}

func (t *fitsTable) hasAll(names []string) bool {
	for _, name := range names {
		found := false
		for i := range t.columns {
			found = found || t.columns[i].name == name
		}
		if !found {
			return false
		}
	}
	return true
}

// title describes the table for a message.
func (t *fitsTable) title(n int) string {
	names := make([]string, len(t.columns))
	for i := range t.columns {
		names[i] = t.columns[i].name
	}
	if len(names) > 20 {
		names = append(names[:20], "…")
	}
	title := fmt.Sprintf("table %d", n)
	if t.name != "" {
		title += fmt.Sprintf(" (%s)", t.name)
	}
	return title + " with " + strings.Join(names, ", ")
}

func (t *fitsTable) rewind() error {
	if _, err := t.content.Seek(t.offset, io.SeekStart); err != nil {
		return err
	}
	t.r = bufio.NewReaderSize(t.content, 1<<18)
	t.row = make([]byte, t.width)
	t.done = 0
	return nil
}

func (t *fitsTable) header() *Header {
	h := &Header{Format: "fits", Columns: make([]HeaderColumn, len(t.columns))}
	for i := range t.columns {
		c := &t.columns[i]
		h.Columns[i] = HeaderColumn{Name: c.name, Unit: c.unit, Text: c.form == 'A', unreadable: c.unreadable}
	}
	return h
}

func (t *fitsTable) count() int { return t.rows }
func (t *fitsTable) line() int  { return 0 }

func (t *fitsTable) close() {
	if c, ok := t.content.(io.Closer); ok {
		c.Close()
	}
}

func (t *fitsTable) next() (bool, error) {
	if t.done == t.rows {
		return false, nil
	}
	if _, err := io.ReadFull(t.r, t.row); err != nil {
		return false, problem("the file ends before the row does; it was changed while it was read, or is damaged")
	}
	t.done++
	return true, nil
}

func (t *fitsTable) number(column int, c *units.Converter) (float64, error) {
	return t.columns[column].number(t.row, c)
}

func (t *fitsTable) text(column int) (string, error) {
	return t.columns[column].text(t.row)
}
