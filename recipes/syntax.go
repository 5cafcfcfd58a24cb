package recipes

import (
	"fmt"
	"regexp"
	"strings"
	"unicode"
	"unicode/utf8"

	"github.com/hashicorp/hcl/v2"
)

// syntax takes over what the parser found. Its own words, written for programs'
// configurations, are replaced where an observer would not understand them.
func (r *report) syntax(file string, diags hcl.Diagnostics) {
	lines := map[int]bool{}
	for _, d := range diags {
		if d.Severity != hcl.DiagError {
			continue
		}
		p := problem{at: hcl.Range{Filename: file}, syntax: true}
		if d.Subject != nil {
			p.at = *d.Subject
			p.at.Filename = file
		}
		line := ""
		if t := r.texts[file]; t != nil && p.at.Start.Line > 0 {
			line = t.line(p.at.Start.Line)
		}
		p.what, p.why, p.write = plainly(d, line)
		r.damaged = true
		for _, word := range []string{"Unclosed", "Unbalanced", "Unterminated", "multi-line"} {
			if strings.Contains(d.Summary, word) {
				r.broken[file] = true
			}
		}
		// Of several on one line the first says what is wrong, and a quote
		// that is missing makes every line behind it look wrong.
		follows := strings.Contains(d.Summary, "multi-line") && lines[p.at.Start.Line-1]
		if !lines[p.at.Start.Line] && !follows {
			r.add(p)
		}
		lines[p.at.Start.Line] = true
	}
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
		return "something follows behind the value",
			"A setting ends with its line. A number with a unit is written in quotes, and so is a word.", "Write for example `from = \"0.2 Mpc\"` or `halo = \"nfw\"`."
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
	}
	return lowerFirst(d.Summary), strings.NewReplacer("argument", "setting", "Argument", "Setting").Replace(d.Detail), ""
}

// leadingPoint finds a number without its zero, as in "x = .5".
var leadingPoint = regexp.MustCompile(`[=<>(,]\s*-?(\.\d+)`)

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
