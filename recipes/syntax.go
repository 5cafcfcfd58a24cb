package recipes

import (
	"bytes"
	"fmt"
	"regexp"
	"slices"
	"strings"
	"unicode"
	"unicode/utf8"

	"github.com/hashicorp/hcl/v2"
	"github.com/hashicorp/hcl/v2/hclsyntax"
)

// maxMends bounds how often a file with syntax errors is parsed again.
const maxMends = 30

// parse parses a file and reports every syntax error in it. The parser reports
// no more than one that it does not recover from, so the line of an error that
// is wrong by itself is taken out and the rest parsed again.
func (r *report) parse(name string, content []byte) *hclsyntax.Body {
	text := bytes.Clone(content)
	passes := min(maxMends, 1+maxRecipeBytes/(len(content)+1))
	for {
		file, diags := hclsyntax.ParseConfig(text, name, hcl.InitialPos)
		body := file.Body.(*hclsyntax.Body)
		errors := inOrder(diags)
		r.damaged = r.damaged || len(errors) > 0
		mended := slices.IndexFunc(errors, func(d *hcl.Diagnostic) bool { return r.mend(text, name, d) })
		if passes--; mended < 0 || passes < 0 {
			r.syntax(name, errors)
			return body
		}
		r.syntaxError(name, errors[mended])
	}
}

// inOrder returns the errors in the order of their places.
func inOrder(diags hcl.Diagnostics) hcl.Diagnostics {
	var errors hcl.Diagnostics
	for _, d := range diags {
		if d.Severity == hcl.DiagError && d.Subject != nil {
			errors = append(errors, d)
		}
	}
	slices.SortStableFunc(errors, func(a, b *hcl.Diagnostic) int { return a.Subject.Start.Byte - b.Subject.Start.Byte })
	return errors
}

// mend changes the line of an error, keeping its length, so that the rest of
// the file can be read: single quotes become double ones, an opening brace moves
// up to its block, any other line whose brackets are balanced is blanked. It
// reports whether it could.
func (r *report) mend(text []byte, name string, d *hcl.Diagnostic) bool {
	if from := d.Subject.Start.Byte; d.Summary == "Invalid block definition" && from < len(text) {
		brace := from + len(text[from:]) - len(bytes.TrimLeft(text[from:], " \t\r\n"))
		if brace > from && brace < len(text) && text[brace] == '{' {
			copy(text[from+1:brace+1], text[from:brace])
			text[from] = '{'
			return true
		}
	}
	t := r.texts[name]
	start := t.starts[d.Subject.Start.Line-1]
	line := text[start : start+len(t.line(d.Subject.Start.Line))]
	if strings.Contains(d.Detail, "Single quotes") && bytes.Count(line, []byte("'"))%2 == 0 {
		for i, c := range line {
			if c == '\'' {
				line[i] = '"'
			}
		}
		return true
	}
	if len(bytes.TrimSpace(line)) == 0 {
		return false
	}
	for _, pair := range []string{"{}", "[]", "()"} {
		if bytes.Count(line, []byte(pair[:1])) != bytes.Count(line, []byte(pair[1:])) {
			return false
		}
	}
	for i := range line {
		line[i] = ' '
	}
	return true
}

// syntax reports the errors of a file that could not be mended.
func (r *report) syntax(file string, errors hcl.Diagnostics) {
	lines := map[int]bool{}
	for _, d := range errors {
		for _, word := range []string{"Unclosed", "Unbalanced", "Unterminated", "multi-line"} {
			if strings.Contains(d.Summary, word) {
				r.broken[file] = true
			}
		}
		// Of several on one line the first says what is wrong, and a quote
		// that is missing makes every line behind it look wrong.
		line := d.Subject.Start.Line
		follows := strings.Contains(d.Summary, "multi-line") && lines[line-1]
		if !lines[line] && !follows {
			r.syntaxError(file, d)
		}
		lines[line] = true
	}
}

// syntaxError reports what the parser found, in other words than its own, which
// are written for the configurations of programs.
func (r *report) syntaxError(file string, d *hcl.Diagnostic) {
	p := problem{at: *d.Subject, syntax: true}
	p.at.Filename = file
	p.what, p.why, p.write = plainly(d, r.texts[file].line(d.Subject.Start.Line))
	r.add(p)
}

// plainly words a message of the parser, about something in the line, for
// observers.
func plainly(d *hcl.Diagnostic, line string) (what, why, write string) {
	switch d.Summary {
	case "Argument or block definition required", "Argument definition required":
		return "this is neither a setting nor a block", "", "Write `name = value`, or `name { … }` over several lines."
	case "Invalid argument name":
		return "the name of a setting stands without quotes", "", "Write `name = value`."
	case "Attribute redefined":
		first := ""
		if words := strings.Split(d.Detail, `"`); len(words) > 2 {
			first = words[1]
		}
		return fmt.Sprintf("%s is set twice", first), "It was set already at " + firstPlace(d.Detail) + ".", "Keep one of the two."
	case "Invalid single-argument block definition":
		return "a block on one line holds a single setting", "", "Write each setting on a line of its own, and the closing brace on the last."
	case "Invalid block definition":
		return "a block begins with its name and an opening brace on the same line", "", "Write `name {` or `name \"label\" {`."
	case "Unclosed configuration block", "Unclosed configuration body":
		return "this block is not closed", "The file ends before the closing brace; it may be missing in a block further down.", "Add } at the end of the block."
	case "Missing newline after argument":
		if m := unquoted.FindStringSubmatch(line); m != nil {
			return "a number with a unit or an error stands in quotes", "", fmt.Sprintf("Write %s = %q.", m[1], m[2])
		}
		return "something follows behind the value", "A setting ends with its line.", "Begin a new line, or put the value into quotes if it is a text or has a unit."
	case "Missing newline after block definition":
		return "something follows behind the closing brace", "", "Begin a new line behind }."
	case "Invalid expression", "Missing expression":
		if number := leadingPoint.FindStringSubmatch(line); number != nil {
			return "a number begins with a digit", "", "Write 0" + number[1] + "."
		}
		return "a value is missing or cannot be read here", "", "Write a number, a text in quotes, a function such as normal(0, 0.1), a reference such as nuisance.name, or a list in brackets."
	case "Invalid multi-line string", "Unterminated string literal", "Unterminated template string":
		return "the closing quote is missing", "", "End the text with \" on the same line."
	case "Invalid number literal":
		return "this is not a number", "", "Write it like 0.3, 12 or 1.5e14."
	case "Invalid character":
		if strings.Contains(d.Detail, "Single quotes") {
			return "texts stand in double quotes", "", "Write \"…\" instead of '…'."
		}
		if m := unquoted.FindStringSubmatch(line); m != nil {
			return "a number with a unit or an error stands in quotes", "", fmt.Sprintf("Write %s = %q.", m[1], m[2])
		}
		return "this character means nothing here", "", "Take it out, or put the text it belongs to into quotes."
	}
	return lowerFirst(d.Summary), strings.NewReplacer("argument", "setting", "Argument", "Setting").Replace(d.Detail), ""
}

// leadingPoint finds a number without its zero, as in "x = .5".
var leadingPoint = regexp.MustCompile(`[=<>(,]\s*-?(\.\d+)`)

// unquoted finds a quantity without its quotes, as in "x = 3 Mpc".
var unquoted = regexp.MustCompile(`^\s*(\w+)\s*=\s*([-+]?\d[^"#]*?)\s*(?:#.*|//.*)?$`)

// firstPlace finds the place in "…was already set at FILE:LINE,COL-COL. Each…".
func firstPlace(detail string) string {
	_, rest, _ := strings.Cut(detail, "set at ")
	place, _, _ := strings.Cut(rest, ". Each")
	if i := strings.LastIndexByte(place, ','); i >= 0 {
		place = place[:i]
	}
	return place
}

func lowerFirst(s string) string {
	r, n := utf8.DecodeRuneInString(s)
	return string(unicode.ToLower(r)) + s[n:]
}
