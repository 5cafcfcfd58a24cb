package catalogue

import (
	"bytes"
	"encoding/binary"
	"math"
	"strconv"
	"strings"
	"unicode/utf8"

	"steelyard/probes/units"
)

// fitsColumn is one column of a FITS binary table.
type fitsColumn struct {
	name, unit  string
	form        byte // the letter of TFORM
	offset      int  // in the row
	width       int  // bytes of one value
	scaled      bool // TSCAL and TZERO are not 1 and 0
	scale, zero float64
	unsigned    bool // the convention for unsigned 64-bit numbers: TZERO = 2**63
	hasNull     bool
	null        int64
	unreadable  string // why the values cannot be read, "" when they can
}

// fitsWidth gives the bytes of one element by the letter of TFORM; X counts
// bits.
var fitsWidth = map[byte]int64{'L': 1, 'X': 1, 'B': 1, 'I': 2, 'J': 4, 'K': 8, 'A': 1, 'E': 4, 'D': 8, 'C': 8, 'M': 16, 'P': 8, 'Q': 16}

// newFITSColumn reads the keywords of the n-th column and returns it with the
// bytes it takes in a row.
func newFITSColumn(h fitsHeader, n int) (c fitsColumn, size int64, err error) {
	number := strconv.Itoa(n)
	c.name = strings.TrimSpace(h["TTYPE"+number])
	c.unit = strings.TrimSpace(h["TUNIT"+number])
	form := strings.TrimSpace(h["TFORM"+number])
	digits := 0
	for digits < len(form) && '0' <= form[digits] && form[digits] <= '9' {
		digits++
	}
	repeat := int64(1)
	if digits > 0 {
		if repeat, err = strconv.ParseInt(form[:digits], 10, 32); err != nil {
			return c, 0, problem("the FITS keyword TFORM%s is %s: too long a column", number, shown(form))
		}
	}
	if digits == len(form) || fitsWidth[form[digits]] == 0 {
		return c, 0, problem("the FITS keyword TFORM%s is %s, which is not the form of a column", number, shown(form))
	}
	c.form = form[digits]
	size = repeat * fitsWidth[c.form]
	c.width = int(fitsWidth[c.form])
	switch c.form {
	case 'X':
		size = (repeat + 7) / 8
		c.unreadable = "holds bits, which are not read"
	case 'C', 'M':
		c.unreadable = "holds complex numbers, which are not read"
	case 'P', 'Q':
		c.unreadable = "holds arrays of varying length; only one value a row is read"
	case 'A':
		c.width = int(repeat)
		if strings.Contains(h["TDIM"+number], ",") {
			c.unreadable = "holds several texts a row; only one value a row is read"
		}
	default:
		if repeat != 1 {
			c.unreadable = "holds arrays of " + strconv.FormatInt(repeat, 10) + " numbers; only one value a row is read"
		}
	}
	return c, size, c.scaling(h, number)
}

// scaling reads TSCAL, TZERO and TNULL.
func (c *fitsColumn) scaling(h fitsHeader, number string) (err error) {
	if c.scale, err = h.real("TSCAL"+number, 1); err != nil {
		return err
	}
	if c.zero, err = h.real("TZERO"+number, 0); err != nil {
		return err
	}
	c.unsigned = c.form == 'K' && c.scale == 1 && c.zero == 1<<63
	c.scaled = (c.scale != 1 || c.zero != 0) && !c.unsigned
	if strings.IndexByte("BIJK", c.form) < 0 {
		return nil // the standard gives TNULL a meaning for whole numbers only
	}
	c.null, err = h.integer("TNULL" + number)
	if err == errNotThere {
		return nil
	}
	c.hasNull = err == nil
	return err
}

// number returns the value in the row, converted.
func (c *fitsColumn) number(row []byte, to *units.Converter) (float64, error) {
	cell := row[c.offset : c.offset+c.width]
	switch c.form {
	case 'D':
		return c.real(math.Float64frombits(binary.BigEndian.Uint64(cell)), to.Shortest, to)
	case 'E':
		return c.real(float64(math.Float32frombits(binary.BigEndian.Uint32(cell))), to.Float, to)
	case 'L':
		switch cell[0] {
		case 'T':
			return to.Float(1)
		case 'F':
			return to.Float(0)
		}
		return 0, missing("is empty; a logical value is expected in every row")
	case 'A':
		text, err := c.text(row)
		if err != nil {
			return 0, err
		}
		return 0, problem("is a column of text; it holds %s where a number is expected", shown(text))
	}
	n := c.integer(cell)
	if c.hasNull && n == c.null {
		return 0, missing("is empty (TNULL); a number is expected in every row")
	}
	switch {
	case c.scaled:
		return to.Shortest(float64(float64(n)*c.scale) + c.zero) // the product rounded by itself, on every machine
	case c.unsigned:
		return to.Decimal(strconv.FormatUint(uint64(n)^1<<63, 10))
	case n > 1<<53 || n < -1<<53:
		return to.Decimal(strconv.FormatInt(n, 10))
	}
	return to.Shortest(float64(n))
}

// real scales and converts a floating-point value.
func (c *fitsColumn) real(x float64, convert func(float64) (float64, error), to *units.Converter) (float64, error) {
	if math.IsNaN(x) {
		return 0, missing("holds NaN; a number is expected in every row")
	}
	if c.scaled {
		x, convert = float64(x*c.scale)+c.zero, to.Shortest
	}
	y, err := convert(x)
	if err != nil {
		return 0, problem("holds %v, %v", x, err)
	}
	return y, nil
}

// integer returns the stored whole number.
func (c *fitsColumn) integer(cell []byte) int64 {
	switch c.form {
	case 'B':
		return int64(cell[0])
	case 'I':
		return int64(int16(binary.BigEndian.Uint16(cell)))
	case 'J':
		return int64(int32(binary.BigEndian.Uint32(cell)))
	}
	return int64(binary.BigEndian.Uint64(cell))
}

// text returns a text without the blanks that fill it up, or a number as it
// would be written.
func (c *fitsColumn) text(row []byte) (string, error) {
	cell := row[c.offset : c.offset+c.width]
	switch c.form {
	case 'A':
		if i := bytes.IndexByte(cell, 0); i >= 0 {
			cell = cell[:i]
		}
		cell = bytes.TrimRight(cell, " ")
		if !utf8.Valid(cell) {
			return "", problem("holds %s, which is not UTF-8 text", shown(string(cell)))
		}
		return string(cell), nil
	case 'L', 'E', 'D':
		return "", problem("is a column of numbers; a column of names is expected")
	}
	n := c.integer(cell)
	switch {
	case c.hasNull && n == c.null:
		return "", nil
	case c.unsigned:
		return strconv.FormatUint(uint64(n)^1<<63, 10), nil
	case c.scaled && (c.scale != 1 || c.zero != math.Trunc(c.zero)):
		return "", problem("is a column of numbers; a column of names is expected")
	}
	return strconv.FormatInt(n+int64(c.zero), 10), nil
}
