package catalogue

import (
	"errors"
	"strings"

	"steelyard/probes/units"
)

// plan is how one wanted column is read.
type plan struct {
	want      Want
	index     int              // of the file's column
	converter *units.Converter // nil for text
	unit      string           // unit of the result
}

// tested is one column the filter looks at.
type tested struct {
	name   string
	index  int
	isText bool
}

// plans is how a whole table is read.
type plans struct {
	columns  []plan
	filter   []tested
	values   []any
	identity *units.Converter
}

// resolve finds the wanted columns and settles their units. It reports every
// problem it finds, joined.
func resolve(header *Header, want []Want, filter *Filter) (*plans, error) {
	identity, err := units.NewConverter(units.Unit{}, units.Unit{})
	if err != nil {
		return nil, err
	}
	p := &plans{identity: identity}
	var problems []error
	for _, w := range want {
		one := plan{want: w, converter: identity}
		var e *Error
		if one.index, e = find(header, w.Name); e == nil && !w.Text && !w.Raw {
			e = one.convert(header.Columns[one.index])
		}
		if e != nil {
			problems = append(problems, e)
			continue
		}
		p.columns = append(p.columns, one)
	}
	if filter != nil {
		for _, name := range filter.Names {
			index, e := find(header, name)
			if e != nil {
				problems = append(problems, e)
				continue
			}
			p.filter = append(p.filter, tested{name, index, header.Columns[index].Text})
		}
		p.values = make([]any, len(filter.Names))
	}
	if len(problems) == 1 {
		return nil, problems[0]
	}
	return p, errors.Join(problems...)
}

// find returns the index of the column with the name.
func find(header *Header, name string) (int, *Error) {
	found := -1
	for i, c := range header.Columns {
		if c.Name != name {
			continue
		}
		if found >= 0 {
			e := problem("two columns have this name; rename one of them")
			e.Column = name
			return 0, e
		}
		found = i
	}
	if found < 0 {
		return 0, problem("%s", absent(name, header.Columns))
	}
	if reason := header.Columns[found].unreadable; reason != "" {
		e := problem("%s", reason)
		e.Column = name
		return 0, e
	}
	return found, nil
}

// convert settles the unit of a column of numbers: the file's and the recipe's
// must not contradict each other, one of them must be there when a unit is
// needed, and it must be of the right dimension.
func (p *plan) convert(c HeaderColumn) *Error {
	fail := func(format string, args ...any) *Error {
		e := problem(format, args...)
		e.Column = c.Name
		return e
	}
	stated := c.Unit
	if unitless[strings.ToLower(stated)] {
		stated = ""
	}
	var from, recipe units.Unit
	var err error
	if stated != "" {
		if from, err = units.Parse(stated); err != nil {
			return fail("the unit in the file cannot be read: %v; correct the file's header", err)
		}
	}
	if p.want.Unit != "" {
		if recipe, err = units.Parse(p.want.Unit); err != nil {
			return fail("the unit in the recipe cannot be read: %v", err)
		}
		if stated == "" {
			from = recipe
		} else if !units.Equal(from, recipe) {
			return fail("the file states %s and the recipe %s; they must agree", stated, p.want.Unit)
		}
	}
	to := units.MustParse(p.want.As)
	if stated == "" && p.want.Unit == "" && p.want.As != "" {
		example := p.want.As
		if to.IsAngle() {
			example = "deg"
		}
		return fail("no unit is stated, neither in the file nor in the recipe; write it behind the name, as in column(%q, %q)", c.Name, example)
	}
	p.unit = p.want.As
	if p.want.Length && from.IsAngle() {
		to, p.unit = units.MustParse("rad"), "rad"
	}
	if p.converter, err = units.NewConverter(from, to); err != nil {
		where := "the file"
		if stated == "" {
			where = "the recipe"
		}
		return fail("%v (%s states it)", err, where)
	}
	return nil
}

// unitless lists what tables write, in lower case, where a column has no unit.
var unitless = map[string]bool{"-": true, "--": true, "---": true, "none": true, "null": true, "n/a": true, "unitless": true, "dimensionless": true}
