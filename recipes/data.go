package recipes

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"slices"

	"github.com/hashicorp/hcl/v2/hclsyntax"

	"steelyard/probes/method"
	"steelyard/probes/units"
)

// data reads one data block.
func (l *loader) data(b *hclsyntax.Block, d method.Block) Data {
	out := Data{Kind: d.Name, Settings: method.Settings{}, Range: b.DefRange()}
	if len(b.Labels) > 0 {
		l.add(problem{at: b.LabelRanges[0], what: fmt.Sprintf("%s takes no name", d.Name), write: fmt.Sprintf("Write %s { … }.", d.Name)})
	}
	hasFile := len(d.Columns) > 0
	var blocks []string
	for _, n := range d.Blocks {
		blocks = append(blocks, n.Name)
	}
	words := append(columnNames(d), settingNames(d.Settings)...)
	if d.Select {
		words = append(words, "select")
	}
	if hasFile {
		words = append([]string{"file"}, words...)
	}
	l.check(b.Body, vocabulary{block: d.Name, settings: words, blocks: blocks})

	if t, given := l.attribute(b.Body, "file"); given && hasFile {
		out.File, out.Path = l.dataFile(t)
	}
	columnsGiven := l.columns(b, d, &out)
	if hasFile && b.Body.Attributes["file"] == nil {
		l.withoutFile(b, d, columnsGiven)
	}
	l.alternatives(b, d)
	for _, s := range d.Settings {
		t, given := l.attribute(b.Body, s.Name)
		if !given {
			l.byDefault(out.Settings, s, b.DefRange(), d.Name)
			continue
		}
		if v, ok := l.value(t, s); ok {
			out.Settings[s.Name] = v
			l.behindTheLens(t, s, v)
		}
	}
	if t, given := l.attribute(b.Body, "select"); given && d.Select {
		out.Select = l.predicate(t, out.Columns)
	}
	for _, inner := range l.once(b.Body.Blocks, d.Name) {
		for _, n := range d.Blocks {
			if inner.Type == n.Name {
				out.Nested = append(out.Nested, l.data(inner, n))
			}
		}
	}
	return out
}

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
	if b.Body.Attributes["file"] == nil {
		return given
	}
	for _, c := range d.Columns {
		if c.Required && !slices.Contains(given, c.Name) {
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
		l.unknownFunction(t)
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
		l.add(problem{at: name.at, what: "the name of a column is a text in quotes", write: "Write " + columnSample(c) + "."})
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
			what = fmt.Sprintf("%s is %s, and needs a unit of it", c.Name, m.describe())
		}
		l.add(problem{at: t.at, what: what, write: "Write " + columnSample(c) + "."})
		return "", false
	}
	return u.String(), true
}

// dataFile reads the name of a data file and checks that there is one.
func (l *loader) dataFile(t term) (file, path string) {
	file, ok := l.plainText(t, "file")
	if !ok {
		return "", ""
	}
	if file == "" {
		l.add(problem{at: t.at, what: "the name of the file is empty", write: "Write file = \"data.csv\", relative to this recipe."})
		return "", ""
	}
	path = file
	if !filepath.IsAbs(path) {
		path = filepath.Join(filepath.Dir(t.at.Filename), path)
	}
	info, err := os.Stat(path)
	switch {
	case err != nil && errors.Is(err, fs.ErrNotExist):
		l.add(problem{at: t.at, what: fmt.Sprintf("the file %s does not exist", path), why: "Files are looked for relative to the recipe that names them.", write: nearestFile(path)})
	case err != nil:
		reason := err
		var inner *fs.PathError
		if errors.As(err, &inner) {
			reason = inner.Err
		}
		l.fail(t.at, "the file %s cannot be looked at: %v", path, reason)
	case info.IsDir():
		l.fail(t.at, "%s is a folder, not a file", path)
	case !info.Mode().IsRegular():
		l.fail(t.at, "%s is not a plain file", path)
	}
	return file, path
}

// withoutFile checks a data block that names no file.
func (l *loader) withoutFile(b *hclsyntax.Block, d method.Block, columns []string) {
	write := "Write file = \"data.csv\", relative to this recipe."
	if len(columns) > 0 || !d.FileOptional {
		l.add(problem{at: b.DefRange(), absence: true, what: fmt.Sprintf("%s needs a file", d.Name), why: sentenceOf(d.Doc), write: write})
		return
	}
	for _, s := range d.Settings {
		if b.Body.Attributes[s.Name] != nil {
			return
		}
	}
	l.add(problem{at: b.DefRange(), absence: true, what: fmt.Sprintf("%s states nothing", d.Name), why: sentenceOf(d.Doc),
		write: fmt.Sprintf("Write file = \"data.csv\" and its columns, or settings instead: %s.", enumerate(settingNames(d.Settings), "%s", "and"))})
}

// alternatives checks that of each group of sets exactly one is given whole.
func (l *loader) alternatives(b *hclsyntax.Block, d method.Block) {
	is := func(name string) bool {
		if b.Body.Attributes[name] != nil {
			return true
		}
		return slices.ContainsFunc(b.Body.Blocks, func(n *hclsyntax.Block) bool { return n.Type == name })
	}
	for _, group := range d.Alternatives {
		var given, ways []string
		onlyColumns := true
		for _, set := range group {
			if len(set) > 0 {
				ways = append(ways, enumerate(set, "%s", "and"))
			}
			for _, name := range set {
				if is(name) && !slices.Contains(given, name) {
					given = append(given, name)
				}
				onlyColumns = onlyColumns && slices.Contains(columnNames(d), name)
			}
		}
		if onlyColumns && b.Body.Attributes["file"] == nil {
			continue // without a file there are no columns
		}
		whole := slices.ContainsFunc(group, func(set []string) bool { return len(set) == len(given) && containsAll(given, set) })
		if whole {
			continue
		}
		p := problem{at: b.DefRange(), absence: len(given) == 0, write: "Write either " + joinWays(ways) + "."}
		if len(ways) == 1 {
			p.write = "Write " + ways[0] + "."
		}
		var lacking []string // of the first set that what is given belongs to
		for _, set := range group {
			if containsAll(set, given) {
				for _, name := range set {
					if !is(name) {
						lacking = append(lacking, name)
					}
				}
				break
			}
		}
		switch {
		case len(given) == 0:
			p.what = fmt.Sprintf("%s needs %s", d.Name, joinWays(ways))
			p.write = ""
		case len(lacking) > 0:
			p.absence = true
			p.what = fmt.Sprintf("%s has %s without %s", d.Name, enumerate(given, "%s", "and"), enumerate(lacking, "%s", "and"))
		default:
			p.what = fmt.Sprintf("%s, given together, contradict each other", enumerate(given, "%s", "and"))
			if a := b.Body.Attributes[given[len(given)-1]]; a != nil {
				p.at = a.NameRange
			}
		}
		l.add(p)
	}
}

// joinWays writes alternatives.
func joinWays(ways []string) string {
	text := ""
	for i, way := range ways {
		if i > 0 {
			text += ", or "
		}
		text += way
	}
	return text
}
