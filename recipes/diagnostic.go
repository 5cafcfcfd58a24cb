package recipes

import (
	"fmt"
	"io"
	"strings"
	"unicode"
)

// Severity tells a mistake from a remark.
type Severity string

// Nothing is computed from a recipe with an error.
const (
	Error   Severity = "error"
	Warning Severity = "warning"
)

// Diagnostic is one thing to say about a recipe. Lines and columns count from
// 1, columns in characters; the end is the character behind the last. Line is 0
// where there is no place to point at: a recipe that cannot be read, or a block
// that is missing.
type Diagnostic struct {
	Severity  Severity `json:"severity"`
	File      string   `json:"file"`
	Line      int      `json:"line"`
	Column    int      `json:"column"`
	EndLine   int      `json:"end_line"`
	EndColumn int      `json:"end_column"`
	Summary   string   `json:"summary"`          // what is wrong, without a full stop
	Detail    string   `json:"detail,omitempty"` // why, in sentences
	Hint      string   `json:"hint,omitempty"`   // what to write instead
	Source    string   `json:"source,omitempty"` // the source line
}

// Diagnostics is everything to say about a recipe, in the order of its files
// and of the places in them.
type Diagnostics []Diagnostic

// HasErrors reports whether any of them is an error.
func (ds Diagnostics) HasErrors() bool {
	for _, d := range ds {
		if d.Severity == Error {
			return true
		}
	}
	return false
}

// Text writes the diagnostics for reading in a terminal of 100 columns:
//
//	recipe.hcl:12:28: error: the unit "keVs" is not known
//	   12 |     value = column("kT", "keVs")
//	      |                          ^^^^^^
//	   Did you mean "keV"?
//
// An empty line stands between two of them.
func (ds Diagnostics) Text(w io.Writer) error {
	var b strings.Builder
	for i, d := range ds {
		if i > 0 {
			b.WriteByte('\n')
		}
		d.write(&b)
	}
	_, err := io.WriteString(w, b.String())
	return err
}

const (
	textWidth   = 96 // of explanations, their indent included
	sourceWidth = 84 // of the part of a source line that is shown
)

func (d Diagnostic) write(b *strings.Builder) {
	place := printable(d.File)
	if d.Line > 0 {
		place = fmt.Sprintf("%s:%d:%d", place, d.Line, d.Column)
	}
	fmt.Fprintf(b, "%s: %s: %s\n", place, d.Severity, printable(d.Summary))
	if d.Line > 0 && strings.TrimSpace(d.Source) != "" {
		line, mark := d.excerpt()
		number := fmt.Sprintf("%5d", d.Line)
		fmt.Fprintf(b, "%s | %s\n%*s | %s\n", number, line, len(number), "", mark)
	}
	for _, text := range []string{d.Detail, d.Hint} {
		if text != "" {
			wrap(b, printable(text), "   ", textWidth)
		}
	}
}

// excerpt returns the part of the source line around the mistake and the carets
// below it.
func (d Diagnostic) excerpt() (line, mark string) {
	cells := characters(printable(d.Source))
	from := min(max(d.Column-1, 0), len(cells))
	to := len(cells)
	if d.EndLine == d.Line {
		to = min(max(d.EndColumn-1, from), len(cells))
	}
	start, end := 0, len(cells)
	if end > sourceWidth {
		start = max(0, min(from-sourceWidth/4, end-sourceWidth))
		end = start + sourceWidth
	}
	if start > 0 {
		line = "…"
		mark = " "
	}
	line += strings.Join(cells[start:end], "")
	if end < len(cells) {
		line += "…"
	}
	for _, c := range cells[start:from] {
		if c == "\t" {
			mark += "\t" // keeps the carets below their text whatever a tab is worth
		} else {
			mark += " "
		}
	}
	return line, mark + strings.Repeat("^", max(1, min(to, end)-from))
}

// characters splits a text into what a reader counts as characters: runes, each
// with the combining marks behind it.
func characters(text string) []string {
	var cells []string
	for _, r := range text {
		if n := len(cells); n > 0 && unicode.In(r, unicode.Mn, unicode.Me) {
			cells[n-1] += string(r)
			continue
		}
		cells = append(cells, string(r))
	}
	return cells
}

// printable replaces what could disturb a terminal.
func printable(text string) string {
	return strings.Map(func(r rune) rune {
		if r == '\t' || unicode.IsPrint(r) {
			return r
		}
		return '·'
	}, text)
}

// wrap writes the text in lines of at most width characters, indented.
func wrap(b *strings.Builder, text, indent string, width int) {
	used := 0
	for _, word := range strings.Fields(text) {
		n := len(characters(word))
		switch {
		case used == 0:
			b.WriteString(indent)
			used = len(indent)
		case used+1+n > width:
			b.WriteString("\n" + indent)
			used = len(indent)
		default:
			b.WriteByte(' ')
			used++
		}
		b.WriteString(word)
		used += n
	}
	b.WriteByte('\n')
}
