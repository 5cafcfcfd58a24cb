package catalogue

import "errors"

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
// names, in that order. Numeric columns arrive as float64, text as string.
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
// all). The format is recognised by content, the name only helps.
func Read(path string, want []Want, filter *Filter, limits Limits) (*Table, error) {
	return nil, errors.New("catalogue: being written")
}

// Header describes a file without reading its rows.
type Header struct {
	Format  string // "csv", "text", "ecsv", "fits"
	Columns []HeaderColumn
}

// HeaderColumn is one column as the file declares it.
type HeaderColumn struct {
	Name string
	Unit string // as the file states it, "" for none
	Text bool
}

// Peek reads a file's header.
func Peek(path string) (*Header, error) { return nil, errors.New("catalogue: being written") }
