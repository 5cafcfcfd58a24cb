package assemble

import (
	"context"
	"fmt"
	"math"

	"steelyard/engine"
	"steelyard/probes/catalogue"
	"steelyard/probes/method"
	"steelyard/recipes"
)

// tableVersion is raised when the same file would give another table.
const tableVersion = 1

// separationColumn is the name by which `select` knows the distance of a galaxy
// from the object's centre, in arcmin.
const separationColumn = "separation"

// tableNode reads the columns of one data block.
func (p *Plan) tableNode(id string, d recipes.Data, declared method.Block) engine.Node {
	var want []catalogue.Want
	n := engine.Node{ID: id, Kind: "table", Version: tableVersion, Files: []string{d.Path}, Where: place(d.Range)}
	n.Params = append(n.Params, fmt.Sprintf("name = %q", d.File))
	for _, c := range d.Columns {
		col := findColumn(declared.Columns, c.Role)
		w := catalogue.Want{Role: c.Role, Name: c.Name, Unit: c.Unit, As: col.Unit, Length: col.Length, Text: col.Text}
		want = append(want, w)
		n.Params = append(n.Params, fmt.Sprintf("column.%s = %q unit %q as %q length %t text %t", w.Role, w.Name, w.Unit, w.As, w.Length, w.Text))
	}
	if d.Select != nil {
		n.Params = append(n.Params, fmt.Sprintf("select = %q", d.Select.Text()))
		if names(d.Select, separationColumn) {
			n.Params = append(n.Params, p.backgroundFacts()...)
		}
	}
	n.Run = func(_ context.Context, job engine.Job) (engine.Output, error) {
		path, err := job.File(d.Path)
		if err != nil {
			return engine.Output{}, err
		}
		t, err := p.read(path, d, want)
		if err != nil {
			return engine.Output{}, err
		}
		t.File = d.File
		out, err := encode(t)
		out.Diagnostics = []string{fmt.Sprintf("%d rows", len(t.Rows))}
		return out, err
	}
	return n
}

func findColumn(declared []method.Column, role string) method.Column {
	for _, c := range declared {
		if c.Name == role {
			return c
		}
	}
	panic("assemble: a recipe names the column " + role + ", which is not declared")
}

func names(p *recipes.Predicate, column string) bool {
	for _, n := range p.Names() {
		if n == column {
			return true
		}
	}
	return false
}

// read reads a table and applies `select`: while reading, or, when the condition
// asks for the distance from the centre, afterwards.
func (p *Plan) read(path string, d recipes.Data, want []catalogue.Want) (*catalogue.Table, error) {
	if d.Select == nil {
		return catalogue.Read(path, want, nil, catalogue.Limits{})
	}
	header, err := catalogue.Peek(path)
	if err != nil {
		return nil, err
	}
	distance := p.background.AngularDiameter(p.object.Redshift)
	condition, err := d.Select.WithDistance(distance).Bind(func(column string) string {
		if column == separationColumn {
			return "arcmin"
		}
		for _, c := range header.Columns {
			if c.Name == column {
				return c.Unit
			}
		}
		return ""
	})
	if err != nil {
		return nil, err
	}
	if !names(condition, separationColumn) {
		return catalogue.Read(path, want, &catalogue.Filter{Names: condition.Names(), Keep: condition.Keep}, catalogue.Limits{})
	}
	return p.readSeparated(path, want, condition, header)
}

func (p *Plan) readSeparated(path string, want []catalogue.Want, condition *recipes.Predicate, header *catalogue.Header) (*catalogue.Table, error) {
	asked := len(want)
	for _, name := range condition.Names() {
		if name != separationColumn {
			want = append(want, catalogue.Want{Role: "select " + name, Name: name, Raw: true, Blank: true, Text: isText(header, name)})
		}
	}
	t, err := catalogue.Read(path, want, nil, catalogue.Limits{})
	if err != nil {
		return nil, err
	}
	ra, dec := t.Values("ra"), t.Values("dec")
	if ra == nil || dec == nil {
		return nil, fmt.Errorf("`select` asks for the separation from the centre, which needs the columns ra and dec")
	}
	var keep []int
	values := make([]any, len(condition.Names()))
	for i := range t.Rows {
		for c, name := range condition.Names() {
			col := t.Column("select " + name)
			switch {
			case name == separationColumn:
				values[c] = separation(p.object.RA, p.object.Dec, ra[i], dec[i]) * 60 * 180 / math.Pi
			case col.Text != nil:
				values[c] = col.Text[i]
			default:
				values[c] = col.Values[i]
			}
		}
		ok, err := condition.Keep(values)
		if err != nil {
			return nil, fmt.Errorf("row %d: %w", t.Rows[i], err)
		}
		if ok {
			keep = append(keep, i)
		}
	}
	t.Columns = t.Columns[:asked]
	return t.Pick(keep), nil
}

func isText(h *catalogue.Header, name string) bool {
	for _, c := range h.Columns {
		if c.Name == name {
			return c.Text
		}
	}
	return false
}

// separation is the angle between two directions in radians, by the haversine
// formula, which keeps its digits for small angles.
func separation(ra1, dec1, ra2, dec2 float64) float64 {
	sd, sr := math.Sin((dec2-dec1)/2), math.Sin((ra2-ra1)/2)
	h := sd*sd + math.Cos(dec1)*math.Cos(dec2)*sr*sr
	return 2 * math.Asin(math.Sqrt(min(h, 1)))
}
