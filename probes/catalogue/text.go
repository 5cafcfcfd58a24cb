package catalogue

import (
	"bufio"
	"errors"
	"io"
	"strconv"
	"strings"

	"steelyard/probes/units"
)

// Bounds on text files, so that a file without line ends or with endless
// comments is refused before it fills memory.
const (
	maxLine     = 1 << 20 // bytes of one record
	maxComments = 4 << 20 // bytes of comments before the first row
	sampled     = 100     // rows that decide whether a column holds numbers or names
)

// blanks stands for a run of blanks as the delimiter.
const blanks = ' '

// layout is how a text table is written.
type layout struct {
	format    string // "csv", "text", "ecsv"
	delimiter rune   // ',', ';', '\t' or blanks
	columns   []HeaderColumn
	logical   []bool // columns of True and False, which ECSV declares; nil for none
	skip      int    // lines before the rows
}

// openText reads the head of a text table and steps back to its first row.
func openText(content io.ReadSeeker) (source, error) {
	l, err := lay(content)
	if err != nil {
		return nil, err
	}
	if l.format != "ecsv" {
		if err := l.judge(content); err != nil {
			return nil, err
		}
	}
	return newTextTable(content, l)
}

// lay finds out how the table is written: the delimiter, the names of the
// columns, the first row.
//
// The names are in the first line that is not a comment, unless that line holds
// a number; then they are in the last comment line before it that has as many
// fields. Lines that begin with "##" are remarks. When the last such comment
// line reads as units throughout, the one before it that does not has the names.
func lay(content io.Reader) (*layout, error) {
	lines := newLineReader(content)
	var comments []string
	total := 0
	for {
		line, err := lines.read()
		if err == io.EOF {
			return nil, problem("the file holds no table: there are only comments and empty lines")
		}
		if err != nil {
			return nil, err
		}
		text := strings.TrimSpace(line)
		if !strings.HasPrefix(text, "#") {
			if text == "" {
				continue
			}
			if len(comments) > 0 && strings.HasPrefix(comments[0], ecsvMark) {
				return layECSV(comments, line, lines.count)
			}
			return layText(comments, line, lines.count)
		}
		if total += len(line); total > maxComments {
			return nil, problem("more than %s of comments before the first row", size(maxComments))
		}
		comments = append(comments, text)
	}
}

// layText lays out a table whose first line that is no comment is given.
func layText(comments []string, first string, count int) (*layout, error) {
	l := &layout{format: "csv", delimiter: delimiterOf(first), skip: count}
	fields, err := split(first, l.delimiter)
	if err != nil {
		return nil, place(err, 0, count, "")
	}
	if l.delimiter == '\t' && emptyAmong(fields) { // tabs that only align
		l.delimiter = blanks
		if fields, err = split(first, blanks); err != nil {
			return nil, place(err, 0, count, "")
		}
	}
	if l.delimiter == blanks {
		l.format = "text"
	}
	names := fields
	if numberAmong(fields) {
		l.skip--
		if names = namesFrom(comments, l.delimiter, len(fields)); names == nil {
			return nil, &Error{Line: count, Reason: "there is no header: the first line holds numbers, and no comment line above it names its " +
				strconv.Itoa(len(fields)) + " columns; put a line of names first"}
		}
	}
	l.columns = make([]HeaderColumn, len(names))
	for i, name := range names {
		l.columns[i].Name = name
	}
	return l, nil
}

// delimiterOf returns what separates the fields of the line: of comma,
// semicolon and tab the most frequent, in this order when equally so, blanks
// when there is none.
func delimiterOf(line string) rune {
	delimiter, most := rune(blanks), 0
	for _, d := range []rune{',', ';', '\t'} {
		quoted, n := false, 0
		for _, r := range line {
			switch {
			case r == '"':
				quoted = !quoted
			case r == d && !quoted:
				n++
			}
		}
		if n > most {
			delimiter, most = d, n
		}
	}
	return delimiter
}

// namesFrom returns the names of n columns from the comment lines, nil when
// none has that many fields.
func namesFrom(comments []string, delimiter rune, n int) []string {
	var last []string
	for i := len(comments) - 1; i >= 0; i-- {
		if strings.HasPrefix(comments[i], "##") {
			continue
		}
		text := strings.TrimPrefix(comments[i], "#")
		fields, err := split(text, delimiter)
		if (err != nil || len(fields) != n) && delimiter != blanks {
			fields, err = split(text, blanks)
		}
		if err != nil || len(fields) != n || emptyAmong(fields) {
			continue
		}
		if !unitsThroughout(fields) {
			return fields
		}
		if last == nil {
			last = fields
		}
	}
	return last
}

func unitsThroughout(fields []string) bool {
	for _, f := range fields {
		if _, err := units.Parse(f); err != nil && !unitless[strings.ToLower(f)] {
			return false
		}
	}
	return true
}

func numberAmong(fields []string) bool {
	for _, f := range fields {
		if f != "" && strings.IndexByte("+-.0123456789", f[0]) >= 0 {
			if _, err := strconv.ParseFloat(f, 64); err == nil || errors.Is(err, strconv.ErrRange) {
				return true
			}
		}
	}
	return false
}

func emptyAmong(fields []string) bool {
	for _, f := range fields {
		if f == "" {
			return true
		}
	}
	return false
}

// judge decides by the first rows which columns hold names: those where a cell
// is neither missing nor a number.
func (l *layout) judge(content io.ReadSeeker) error {
	t, err := newTextTable(content, l)
	if err != nil {
		return err
	}
	for range sampled {
		if more, err := t.next(); err != nil || !more {
			break // what is wrong is said when the rows are read
		}
		for i := range l.columns {
			cell := t.cell(i)
			if !isMissing(cell) && !numberAmong([]string{cell}) {
				l.columns[i].Text = true
			}
		}
	}
	return nil
}

// lineReader reads lines of bounded length and counts them.
type lineReader struct {
	r     *bufio.Reader
	count int
	buf   []byte
}

func newLineReader(r io.Reader) *lineReader {
	return &lineReader{r: bufio.NewReaderSize(r, 1<<16)}
}

// read returns the next line without its end; io.EOF at the end of the file. A
// byte-order mark at the beginning of the file is dropped.
func (l *lineReader) read() (string, error) {
	l.buf = l.buf[:0]
	for {
		part, err := l.r.ReadSlice('\n')
		l.buf = append(l.buf, part...)
		if len(l.buf) > maxLine {
			return "", &Error{Line: l.count + 1, Reason: errLongLine.Error()}
		}
		if err == bufio.ErrBufferFull {
			continue
		}
		if err != nil && (err != io.EOF || len(l.buf) == 0) {
			return "", err
		}
		break
	}
	l.count++
	line := strings.TrimRight(string(l.buf), "\r\n")
	if l.count == 1 {
		line = strings.TrimPrefix(line, "\ufeff")
	}
	return line, nil
}
