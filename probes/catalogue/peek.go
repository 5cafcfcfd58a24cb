package catalogue

// Header describes a file without reading its rows.
type Header struct {
	Format  string // "csv", "text", "ecsv", "fits"
	Columns []HeaderColumn
}

// HeaderColumn is one column as the file declares it.
type HeaderColumn struct {
	Name string
	Unit string // as the file states it, "" for none
	Text bool   // names rather than numbers; in CSV and text judged by the first rows

	unreadable string // why its values cannot be read, "" when they can
}

// Peek reads a file's header. Of a FITS file with several binary tables it is
// the first.
func Peek(path string) (*Header, error) {
	src, err := open(path, nil)
	if err != nil {
		return nil, at(path, err)
	}
	defer src.close()
	return src.header(), nil
}
