package catalogue

import (
	"strings"
	"testing"
)

func ecsv(yaml, rows string) string {
	var b strings.Builder
	b.WriteString("# %ECSV 1.0\n# ---\n")
	for line := range strings.Lines(yaml) {
		b.WriteString("# " + line)
	}
	return b.String() + rows
}

func TestBadECSV(t *testing.T) {
	const one = "datatype:\n- {name: a, unit: keV, datatype: float64}\n"
	for _, c := range []struct{ name, content, text string }{
		{"no datatype", ecsv("meta: {x: 1}\n", "a\n1\n"), "declares no columns"},
		{"not YAML", ecsv("datatype:\n- {name: a\n", "a\n1\n"), "the YAML of the ECSV header cannot be read"},
		{"not a list", ecsv("datatype: 5\n", "a\n1\n"), "the YAML of the ECSV header cannot be read"},
		{"no type", ecsv("datatype:\n- {name: a}\n", "a\n1\n"), `gives no datatype for column "a"`},
		{"other names", ecsv(one, "b\n1\n"), `line 5: the ECSV header declares column "a" where the line of names has "b"`},
		{"more names", ecsv(one, "a b\n1 2\n"), "line 5: the line of names has a different number of columns"},
		{"strange delimiter", ecsv("delimiter: ';'\n"+one, "a\n1\n"), `the delimiter ";"; it must be a space or a comma`},
		{"complex", ecsv("datatype:\n- {name: a, datatype: complex128}\n", "a\n1\n"), "complex numbers"},
		{"no names", ecsv(one, ""), "there are only comments"},
		{"not a number", ecsv(one, "a\nx\n"), `row 1 (line 6), column "a": holds "x", which is not a number`},
		{"wrong dimension", ecsv(strings.Replace(one, "keV", "kpc", 1), "a\n1\n"), "the file states kpc and the recipe keV; they must agree"},
		{"contradiction", ecsv(strings.Replace(one, "keV", "eV", 1), "a\n1\n"), "the file states eV and the recipe keV; they must agree"},
		{"unit that cannot be read", ecsv(strings.Replace(one, "keV", "keV/h", 1), "a\n1\n"), "the unit in the file cannot be read"},
		{"nested", ecsv("datatype: "+strings.Repeat("[", 4000)+"\n", "a\n1\n"), "nested too deeply"},
		{"a long line", ecsv("datatype: "+strings.Repeat("a: ", 4000)+"\n", "a\n1\n"), "more than 4096 characters"},
	} {
		table, err := Read(saved(t, "t.ecsv", c.content), []Want{{Role: "a", Name: "a", Unit: "keV", As: "keV"}}, nil, Limits{})
		if err == nil || !strings.Contains(err.Error(), c.text) {
			t.Errorf("%s: %+v, %v; want %s", c.name, table, err, c.text)
		}
	}
	// The same table without a mistake, the unit spelt otherwise, meta with tags
	// and anchors that nobody needs.
	good := ecsv("delimiter: ','\nmeta: !!omap\n- x: &id [1]\n- y: *id\ndatatype:\n- name: a\n  unit: 10**3 eV\n  datatype: float32\n  description: |\n    two\n    lines\nschema: astropy-2.0\n", "a\n1.5\n")
	table, err := Read(saved(t, "t.ecsv", good), []Want{{Role: "a", Name: "a", Unit: "keV", As: "keV"}}, nil, Limits{})
	if err != nil || table.Values("a")[0] != 1.5 {
		t.Errorf("%+v, %v", table, err)
	}
}
