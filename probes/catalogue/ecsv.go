package catalogue

import (
	"strings"

	"github.com/goccy/go-yaml"
)

// ecsvMark begins every ECSV file (Astropy Proposal for Enhancement 6).
const ecsvMark = "# %ECSV"

// Bounds on the YAML of an ECSV header: its parser takes time that grows with
// the square of the nesting.
const (
	maxYAMLLine  = 4096
	maxYAMLLists = 2000
)

// ecsvHeader is what is needed of the YAML in an ECSV header.
type ecsvHeader struct {
	Delimiter string
	Datatype  []struct {
		Name, Unit, Datatype, Subtype string
	}
}

// layECSV lays out an ECSV table from its comment lines and its line of names.
func layECSV(comments []string, first string, count int) (*layout, error) {
	text, err := declared(comments)
	if err != nil {
		return nil, err
	}
	var h ecsvHeader
	if err := yaml.Unmarshal([]byte(text), &h); err != nil {
		return nil, problem("the YAML of the ECSV header cannot be read: %s", strings.SplitN(err.Error(), "\n", 2)[0])
	}
	l := &layout{format: "ecsv", delimiter: blanks, skip: count}
	switch h.Delimiter {
	case "", " ":
	case ",":
		l.delimiter = ','
	default:
		return nil, problem("the ECSV header names the delimiter %s; it must be a space or a comma", shown(h.Delimiter))
	}
	names, err := split(first, l.delimiter)
	if err != nil {
		return nil, place(err, 0, count, "")
	}
	if len(names) != len(h.Datatype) {
		return nil, &Error{Line: count, Reason: "the line of names has a different number of columns than the ECSV header declares"}
	}
	l.logical = make([]bool, len(names))
	for i, d := range h.Datatype {
		if d.Name != names[i] {
			return nil, &Error{Line: count, Reason: "the ECSV header declares column " + shown(d.Name) + " where the line of names has " + shown(names[i])}
		}
		c := HeaderColumn{Name: d.Name, Unit: d.Unit, Text: d.Datatype == "string"}
		switch {
		case d.Subtype != "":
			c.unreadable = "holds arrays (" + d.Subtype + "); only one value a row is read"
		case strings.HasPrefix(d.Datatype, "complex"):
			c.unreadable = "holds complex numbers, which are not read"
		case d.Datatype == "":
			return nil, problem("the ECSV header gives no datatype for column %s", shown(d.Name))
		}
		l.logical[i] = d.Datatype == "bool"
		l.columns = append(l.columns, c)
	}
	return l, nil
}

// declared returns the parts of the YAML header that describe the columns; the
// rest, `meta` above all, may be long and full of tags.
func declared(comments []string) (string, error) {
	var b strings.Builder
	wanted := false
	for _, c := range comments[1:] {
		line := strings.TrimPrefix(c, "#")
		line = strings.TrimPrefix(line, " ")
		if line != "" && line[0] != ' ' && line[0] != '-' && line[0] != '#' {
			wanted = strings.HasPrefix(line, "datatype:") || strings.HasPrefix(line, "delimiter:")
		}
		if !wanted || line == "---" {
			continue
		}
		if len(line) > maxYAMLLine {
			return "", problem("a line of more than %d characters in the ECSV header", maxYAMLLine)
		}
		b.WriteString(line)
		b.WriteByte('\n')
	}
	text := b.String()
	if text == "" {
		return "", problem("the ECSV header declares no columns (datatype)")
	}
	if strings.Count(text, "[") > maxYAMLLists {
		return "", problem("the ECSV header is nested too deeply")
	}
	return text, nil
}
