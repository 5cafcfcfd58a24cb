package catalogue

import (
	"encoding/csv"
	"errors"
	"io"
	"strings"
)

// split cuts one line into fields, blanks around each removed.
func split(line string, delimiter rune) ([]string, error) {
	if delimiter == blanks {
		return splitBlanks(nil, line)
	}
	fields, err := newCSV(strings.NewReader(line), delimiter).Read()
	if err != nil {
		return nil, csvProblem(err)
	}
	for i, f := range fields {
		fields[i] = strings.TrimSpace(f)
	}
	return fields, nil
}

// splitBlanks cuts a line at runs of blanks and appends the fields to dst. A
// field in double quotes may hold blanks, and a quote written twice.
func splitBlanks(dst []string, line string) ([]string, error) {
	for {
		line = strings.TrimLeft(line, " \t\r\n")
		if line == "" {
			return dst, nil
		}
		if line[0] != '"' {
			end := strings.IndexAny(line, " \t\r\n")
			if end < 0 {
				end = len(line)
			}
			dst, line = append(dst, line[:end]), line[end:]
			continue
		}
		field, rest, ok := unquote(line)
		if !ok {
			return nil, problem("a quotation mark is not closed on this line, or not followed by a blank: %s", shown(line))
		}
		dst, line = append(dst, field), rest
	}
}

// unquote takes the quoted field off the beginning of the line.
func unquote(line string) (field, rest string, ok bool) {
	for i := 1; i < len(line); i++ {
		if line[i] != '"' {
			continue
		}
		if i+1 < len(line) && line[i+1] == '"' {
			i++
			continue
		}
		rest = line[i+1:]
		return strings.ReplaceAll(line[1:i], `""`, `"`), rest, rest == "" || strings.IndexByte(" \t\r\n", rest[0]) >= 0
	}
	return "", "", false
}

func newCSV(r io.Reader, delimiter rune) *csv.Reader {
	c := csv.NewReader(r)
	c.Comma = delimiter
	c.Comment = '#'
	c.FieldsPerRecord = -1
	c.TrimLeadingSpace = delimiter != '\t'
	c.ReuseRecord = true
	return c
}

// csvProblem turns an error of encoding/csv into one for people.
func csvProblem(err error) error {
	var parse *csv.ParseError
	if !errors.As(err, &parse) {
		return err
	}
	e := &Error{Err: parse.Err, Reason: parse.Err.Error()}
	switch {
	case errors.Is(parse.Err, csv.ErrBareQuote):
		e.Reason = "a quotation mark inside a field; put the whole field in quotation marks and write the inner one twice"
	case errors.Is(parse.Err, csv.ErrQuote):
		e.Reason = "a quotation mark is not closed, or not followed by a delimiter"
	case errors.Is(parse.Err, errLongLine):
		e.Reason = errLongLine.Error()
	}
	return e
}

// errLongLine is returned when one record exceeds maxLine.
var errLongLine = errors.New("a line, or a field in quotation marks, of more than " + size(maxLine) + "; this does not look like a table")
