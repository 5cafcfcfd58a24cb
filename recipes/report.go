package recipes

import (
	"fmt"
	"sort"
	"strings"

	"github.com/hashicorp/hcl/v2"
)

// maxDiagnostics bounds what is said about a file that is no recipe at all.
const maxDiagnostics = 200

// problem is a mistake as the checks report it.
type problem struct {
	at      hcl.Range // Filename alone for a file without a place to point at
	what    string    // without a full stop
	why     string    // sentences, or ""
	write   string    // what to write instead, or ""
	warning bool
	// absence marks a problem that something is missing: it may be a
	// consequence when a part of the file could not be parsed.
	absence bool
	// syntax marks a problem that the parser found.
	syntax bool
}

// report gathers problems. The files it points into are known to it by name.
type report struct {
	order    map[string]int // of the files, as they were read
	texts    map[string]*text
	problems []problem
	broken   map[string]bool // files whose blocks could not be told apart
	damaged  bool            // some file has a syntax error
}

func newReport() *report {
	return &report{order: map[string]int{}, texts: map[string]*text{}, broken: map[string]bool{}}
}

// file makes a file known, so that its lines can be quoted.
func (r *report) file(name string, content []byte) {
	if _, known := r.order[name]; !known {
		r.order[name] = len(r.order)
	}
	r.texts[name] = newText(content)
}

func (r *report) add(p problem) { r.problems = append(r.problems, p) }

// fail adds an error with a formatted summary.
func (r *report) fail(at hcl.Range, format string, args ...any) {
	r.add(problem{at: at, what: fmt.Sprintf(format, args...)})
}

// diagnostics returns what is worth saying, in order: consequences of syntax
// errors and repetitions are left out.
func (r *report) diagnostics() Diagnostics {
	syntaxLines := map[string]bool{}
	place := func(file string, line int) string { return fmt.Sprintf("%d:%s", line, file) }
	anyBroken := len(r.broken) > 0
	for _, p := range r.problems {
		if p.syntax {
			for line := p.at.Start.Line; line <= p.at.End.Line; line++ {
				syntaxLines[place(p.at.Filename, line)] = true
			}
		}
	}
	kept := r.problems[:0:0]
	for _, p := range r.problems {
		consequence := !p.syntax && (p.absence && r.damaged ||
			anyBroken && p.warning || r.broken[p.at.Filename] || syntaxLines[place(p.at.Filename, p.at.Start.Line)])
		if !consequence {
			kept = append(kept, p)
		}
	}
	sort.SliceStable(kept, func(i, j int) bool { return r.before(kept[i], kept[j]) })
	ds := make(Diagnostics, 0, len(kept))
	more := 0
	for i, p := range kept {
		switch {
		case i > 0 && p == kept[i-1]:
		case len(ds) >= maxDiagnostics:
			more++
		default:
			ds = append(ds, r.diagnostic(p))
		}
	}
	if more > 0 {
		last := hcl.Range{Filename: kept[len(kept)-1].at.Filename}
		ds = append(ds, r.diagnostic(problem{at: last, what: fmt.Sprintf("%d more mistakes are not shown", more)}))
	}
	return ds
}

// before orders problems by file, place, severity and text.
func (r *report) before(a, b problem) bool {
	if x, y := r.order[a.at.Filename], r.order[b.at.Filename]; x != y {
		return x < y
	}
	if x, y := a.at.Start.Line > 0, b.at.Start.Line > 0; x != y {
		return y // without a place first
	}
	if x, y := a.at.Start.Byte, b.at.Start.Byte; x != y {
		return x < y
	}
	if a.warning != b.warning {
		return b.warning
	}
	if x, y := a.at.End.Byte, b.at.End.Byte; x != y {
		return x < y
	}
	if a.what != b.what {
		return a.what < b.what
	}
	return a.why+"\x00"+a.write < b.why+"\x00"+b.write
}

func (r *report) diagnostic(p problem) Diagnostic {
	d := Diagnostic{Severity: Error, File: p.at.Filename, Summary: p.what, Detail: p.why, Hint: p.write}
	if p.warning {
		d.Severity = Warning
	}
	t := r.texts[p.at.Filename]
	if t == nil || p.at.Start.Line == 0 {
		return d
	}
	d.Line, d.Column = t.locate(p.at.Start.Byte)
	d.EndLine, d.EndColumn = t.locate(max(p.at.End.Byte, p.at.Start.Byte))
	d.Source = t.line(d.Line)
	return d
}

// where names a place for messages about two places.
func (r *report) where(at hcl.Range) string {
	return fmt.Sprintf("%s:%d", at.Filename, at.Start.Line)
}

// text is the content of a file, with an index of its lines.
type text struct {
	content []byte
	starts  []int // offset of the first byte of every line
}

func newText(content []byte) *text {
	t := &text{content: content, starts: []int{0}}
	for i, c := range content {
		if c == '\n' {
			t.starts = append(t.starts, i+1)
		}
	}
	return t
}

// locate returns the line and column of a byte offset, counted from 1.
func (t *text) locate(offset int) (line, column int) {
	offset = min(max(offset, 0), len(t.content))
	line = sort.SearchInts(t.starts, offset+1)
	return line, len(characters(string(t.content[t.starts[line-1]:offset]))) + 1
}

// line returns the text of a line counted from 1.
func (t *text) line(n int) string {
	end := len(t.content)
	if n < len(t.starts) {
		end = t.starts[n] - 1
	}
	return strings.TrimRight(string(t.content[t.starts[n-1]:end]), "\r")
}

// place returns a byte offset as HCL states places.
func (t *text) place(offset int) hcl.Pos {
	line, column := t.locate(offset)
	return hcl.Pos{Line: line, Column: column, Byte: offset}
}
