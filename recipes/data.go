package recipes

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"

	"github.com/hashicorp/hcl/v2/hclsyntax"

	"steelyard/probes/method"
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
	if hasFile && !l.has(b.Body, "file") {
		l.withoutFile(b, d, columnsGiven)
	}
	l.alternatives(b, d)
	for _, s := range d.Settings {
		t, given := l.attribute(b.Body, s.Name)
		if !given {
			l.byDefault(out.Settings, s, b, d.Name)
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
	l.once(b.Body.Blocks, d.Name)
	for _, inner := range b.Body.Blocks {
		for _, n := range d.Blocks {
			if inner.Type == n.Name {
				out.Nested = append(out.Nested, l.data(inner, n))
			}
		}
	}
	return out
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
		l.add(problem{at: t.at, what: fmt.Sprintf("the file %s does not exist", path), why: "Files are looked for relative to the file that names them.", write: nearestFile(path)})
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
		if l.has(b.Body, s.Name) {
			return
		}
	}
	l.add(problem{at: b.DefRange(), absence: true, what: fmt.Sprintf("%s states nothing", d.Name), why: sentenceOf(d.Doc),
		write: fmt.Sprintf("Write file = \"data.csv\" and its columns, or settings instead: %s.", enumerate(settingNames(d.Settings), "%s", "and"))})
}
