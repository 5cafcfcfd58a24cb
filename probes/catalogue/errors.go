package catalogue

import (
	"fmt"
	"strconv"
	"strings"

	"github.com/agext/levenshtein"
)

// Error is something wrong with a data file: where, what, and what to do.
type Error struct {
	File   string // as given to Read
	Row    int    // data row, counted from 1, header not counted; 0 when it is not about one row
	Line   int    // line of that row in a text file; 0 in a binary one
	Column string // as the file names it; "" when it is not about one column
	Reason string
	Err    error // what lies behind it, if anything
}

// Error writes "file, row 3 (line 5), column "kT": reason".
func (e *Error) Error() string {
	var b strings.Builder
	b.WriteString(e.File)
	if e.Row > 0 {
		fmt.Fprintf(&b, ", row %d", e.Row)
		if e.Line > 0 {
			fmt.Fprintf(&b, " (line %d)", e.Line)
		}
	} else if e.Line > 0 {
		fmt.Fprintf(&b, ", line %d", e.Line)
	}
	if e.Column != "" {
		fmt.Fprintf(&b, ", column %q", e.Column)
	}
	return b.String() + ": " + e.Reason
}

// Unwrap returns the error behind it.
func (e *Error) Unwrap() error { return e.Err }

// problem is an Error that does not know its file and place yet.
func problem(format string, args ...any) *Error {
	return &Error{Reason: fmt.Sprintf(format, args...)}
}

// missing is the reason why a cell has no value; a Want may allow that.
type missing string

func (m missing) Error() string { return string(m) }

// absent explains that a column is not there, with the nearest name and a list
// of those that are.
func absent(name string, columns []HeaderColumn) string {
	const most = 30
	names := make([]string, 0, len(columns))
	near, least := "", 1+max(1, len(name)/3)
	for _, c := range columns {
		names = append(names, c.Name)
		d := levenshtein.Distance(strings.ToLower(name), strings.ToLower(c.Name), nil)
		if d < least && c.Name != "" {
			near, least = c.Name, d
		}
	}
	reason := "there is no column " + strconv.Quote(name)
	if near != "" {
		reason += "; did you mean " + strconv.Quote(near) + "?"
	}
	if len(names) > most {
		names = append(names[:most], fmt.Sprintf("and %d more", len(names)-most))
	}
	return reason + " (the columns are: " + strings.Join(names, ", ") + ")"
}

// shown quotes a piece of a file for a message, shortened.
func shown(text string) string {
	const most = 40
	if len(text) > most {
		return strconv.Quote(strings.ToValidUTF8(text[:most], "?")) + "…"
	}
	return strconv.Quote(text)
}

// counted writes "1 value", "2 values".
func counted(n int, what string) string {
	if n != 1 {
		what += "s"
	}
	return strconv.Itoa(n) + " " + what
}
