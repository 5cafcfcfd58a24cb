package catalogue

import (
	"bytes"
	"errors"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
)

// open recognises the format by content and opens the table; names are the
// columns that will be asked for, by which one of several tables is chosen.
func open(path string, names []string) (source, error) {
	f, err := os.Open(path)
	if err != nil {
		e := &Error{Reason: "the file cannot be opened", Err: err}
		var pathError *fs.PathError
		switch {
		case errors.Is(err, fs.ErrNotExist):
			e.Reason = "there is no such file"
		case errors.As(err, &pathError):
			e.Reason += ": " + pathError.Err.Error()
		}
		return nil, e
	}
	src, err := openFile(f, path, names)
	if err != nil {
		f.Close()
		return nil, err
	}
	return src, nil
}

func openFile(f *os.File, path string, names []string) (source, error) {
	info, err := f.Stat()
	if err != nil {
		return nil, err
	}
	if info.IsDir() {
		return nil, problem("this is a folder, not a file")
	}
	if !info.Mode().IsRegular() {
		return nil, problem("this is not a regular file; tables are read from files on disk")
	}
	return openContent(f, info.Size(), path, names)
}

// openContent opens the table in size bytes. If content is an io.Closer the
// source closes it.
func openContent(content io.ReadSeeker, size int64, path string, names []string) (source, error) {
	head := make([]byte, min(size, headBytes))
	if _, err := io.ReadFull(content, head); err != nil {
		return nil, err
	}
	if _, err := content.Seek(0, io.SeekStart); err != nil {
		return nil, err
	}
	format, err := recognise(head)
	if err != nil {
		return nil, err
	}
	if err := agrees(format, strings.ToLower(filepath.Ext(path)), head); err != nil {
		return nil, err
	}
	if format == "fits" {
		return openFITS(content, size, names)
	}
	return openText(content)
}

// headBytes is how much of a file is looked at to recognise its format.
const headBytes = 1 << 14

// foreign lists formats that are known by their first bytes and not read.
var foreign = []struct{ magic, what string }{
	{"\x1f\x8b", "a gzip file; unpack it first (gunzip)"},
	{"BZh", "a bzip2 file; unpack it first (bunzip2)"},
	{"\xfd7zXZ", "an xz file; unpack it first (unxz)"},
	{"PK\x03\x04", "a zip file or a spreadsheet; save the table as CSV"},
	{"\xd0\xcf\x11\xe0", "an old spreadsheet; save the table as CSV"},
	{"\x89HDF", "an HDF5 file; save the table as FITS or ECSV"},
	{"PAR1", "a Parquet file; save the table as FITS or ECSV"},
	{"\x93NUMPY", "a NumPy file; save the table as FITS or ECSV"},
	{"%PDF", "a PDF document; a table of numbers is needed"},
	{"\xff\xfe", "text in UTF-16; save it as UTF-8"},
	{"\xfe\xff", "text in UTF-16; save it as UTF-8"},
	{"<?xml", "an XML file, perhaps a VOTable, which is not read yet; save the table as FITS or ECSV"},
	{"<VOTABLE", "a VOTable, which is not read yet; save the table as FITS or ECSV"},
	{"<!DOCTYPE", "a web page, not a table"},
	{"<html", "a web page, not a table"},
}

// recognise tells a FITS file from text, by the first bytes.
func recognise(head []byte) (format string, err error) {
	head = bytes.TrimPrefix(head, []byte("\ufeff")) // a byte-order mark
	if len(head) == 0 {
		return "", problem("the file is empty")
	}
	if bytes.HasPrefix(head, []byte("SIMPLE  =")) {
		return "fits", nil
	}
	for _, f := range foreign {
		if bytes.HasPrefix(head, []byte(f.magic)) {
			return "", problem("this is %s", f.what)
		}
	}
	if bytes.HasPrefix(head, []byte("XTENSION=")) {
		return "", problem("this FITS extension lacks the primary header that must come before it")
	}
	if i := bytes.IndexByte(head, 0); i >= 0 {
		return "", problem("this is neither a FITS file nor text (byte %d is zero)", i+1)
	}
	if bytes.Contains(head, []byte("Byte-by-byte Description of file")) {
		return "", problem("this is a machine-readable table with a byte-by-byte description, which is not read yet; save it as ECSV or CSV")
	}
	if bytes.HasPrefix(head, []byte(ecsvMark)) {
		return "ecsv", nil
	}
	return "text", nil
}

// agrees holds the format against the end of the file's name.
func agrees(format, extension string, head []byte) error {
	switch extension {
	case ".fits", ".fit", ".fts":
		if format != "fits" {
			return problem("the name says FITS, but the file begins with %s and not with a FITS header", shown(string(head[:min(len(head), 30)])))
		}
	case ".ecsv":
		if format != "ecsv" {
			return problem("the name says ECSV, but the file does not begin with %q", ecsvMark+" 1.0")
		}
	case ".csv", ".tsv", ".txt", ".dat":
		if format == "fits" {
			return problem("the name says text, but this is a FITS file; name it %q", ".fits")
		}
	}
	return nil
}
