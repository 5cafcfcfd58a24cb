package recipes

import (
	"fmt"
	"slices"

	"github.com/hashicorp/hcl/v2/hclsyntax"

	"steelyard/probes/method"
	"steelyard/probes/units"
)

func columnNames(d method.Block) []string {
	names := make([]string, len(d.Columns))
	for i, c := range d.Columns {
		names[i] = c.Name
	}
	return names
}

// columns reads the columns of a data block and returns the names of those
// given, readable or not.
func (l *loader) columns(b *hclsyntax.Block, d method.Block, out *Data) (given []string) {
	for _, c := range d.Columns {
		t, ok := l.attribute(b.Body, c.Name)
		if !ok {
			continue
		}
		given = append(given, c.Name)
		if column, ok := l.column(t, c); ok {
			out.Columns = append(out.Columns, column)
		}
	}
	if slices.Contains(given, "ra") && slices.Contains(given, "dec") && l.centreFor.Filename == "" {
		l.centreFor = b.DefRange()
	}
	if !l.has(b.Body, "file") {
		return given
	}
	for _, c := range d.Columns {
		if c.Required && !l.has(b.Body, c.Name) {
			l.add(problem{at: b.DefRange(), absence: true, what: fmt.Sprintf("%s needs the column %s", d.Name, c.Name), why: sentenceOf(c.Doc), write: fmt.Sprintf("Write %s = %s.", c.Name, columnSample(c))})
		}
	}
	return given
}

// columnSample shows how a column is named.
func columnSample(c method.Column) string {
	if c.Unit == "" {
		return "column(\"…\")"
	}
	unit := map[string]string{"kpc": "kpc", "rad": "deg"}[c.Unit]
	if unit == "" {
		unit = c.Unit
	}
	return fmt.Sprintf("column(\"…\", %q)", unit)
}

// column reads column(name) or column(name, unit).
func (l *loader) column(t term, c method.Column) (Column, bool) {
	out := Column{Role: c.Name, Range: t.at}
	if t.kind == badTerm {
		return out, false
	}
	if t.kind == callTerm && t.name != "column" && nearest(t.name, functions) == "column" {
		l.unknownFunction(t, "column")
		return out, false
	}
	if !t.is("column") {
		p := problem{at: t.at, what: fmt.Sprintf("%s is a column of the file, not %s", c.Name, t.describe()), write: "Write " + columnSample(c) + " with the name in the file."}
		if t.kind == textTerm && t.text != "" {
			p.write = fmt.Sprintf("Write column(%q), with its unit behind the name where the file does not state it.", t.text)
		}
		l.add(p)
		return out, false
	}
	if !l.count(t, []string{"\"name\"", "\"unit\""}, 1) {
		return out, false
	}
	name := t.items[0]
	ok := name.kind == textTerm && name.text != ""
	if !ok && name.kind != badTerm {
		write := "Write " + columnSample(c) + "."
		if name.word() != "" {
			write = fmt.Sprintf("Write %q.", name.word())
		}
		l.add(problem{at: name.at, what: "the name of a column is a text in quotes", write: write})
	}
	out.Name = name.text
	if len(t.items) == 2 {
		var good bool
		out.Unit, good = l.columnUnit(t.items[1], c)
		ok = ok && good
	}
	return out, ok
}

// columnUnit reads the unit of a column and checks its dimension.
func (l *loader) columnUnit(t term, c method.Column) (string, bool) {
	if t.kind != textTerm {
		if t.kind != badTerm {
			l.add(problem{at: t.at, what: "a unit is a text in quotes", write: "Write " + columnSample(c) + "."})
		}
		return "", false
	}
	u, err := units.Parse(t.text)
	if err != nil {
		l.unitError(t, err, fmt.Sprintf("the unit of %s cannot be read", c.Name))
		return "", false
	}
	m := measure{c.Unit, c.Length}
	if c.Text {
		l.add(problem{at: t.at, what: fmt.Sprintf("%s holds names and has no unit", c.Name), write: "Write column(\"…\")."})
		return "", false
	}
	if _, fits := m.fits(u); !fits {
		what := fmt.Sprintf("%s is %s, and %s is a unit of %s", c.Name, m.describe(), t.text, u.Describe())
		if u.IsPure() {
			what = fmt.Sprintf("%s is %s: it needs a unit", c.Name, m.describe())
		}
		l.add(problem{at: t.at, what: what, write: "Write " + columnSample(c) + "."})
		return "", false
	}
	return u.String(), true
}
