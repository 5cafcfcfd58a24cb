package recipes

import (
	"encoding/json"
	"strings"
	"testing"
)

// The caret stands below the mistake: behind tabs, behind accents made of two
// characters, and in the visible part of a long line.
func TestCaret(t *testing.T) {
	for _, c := range []struct {
		name, source string
		column, end  int
		want         string
	}{
		{"plain", "x = 3 kpc", 5, 6, "    1 | x = 3 kpc\n      |     ^\n"},
		{"tab", "\tx = 3", 6, 7, "    1 | \tx = 3\n      | \t    ^\n"},
		{"combining", "re\u0301gion = 3", 10, 11, "    1 | re\u0301gion = 3\n      |          ^\n"},
		{"end of line", "x =", 4, 4, "    1 | x =\n      |    ^\n"},
		{"control characters", "x = \x1b[31m", 5, 6, "    1 | x = ·[31m\n      |     ^\n"},
		{"beyond the line", "x", 40, 50, "    1 | x\n      |  ^\n"},
	} {
		var b strings.Builder
		Diagnostics{{Severity: Error, File: "f", Line: 1, Column: c.column, EndLine: 1, EndColumn: c.end, Summary: "s", Source: c.source}}.Text(&b)
		if got := strings.TrimPrefix(b.String(), "f:1:"); !strings.HasSuffix(got, c.want) {
			t.Errorf("%s:\n%swant\n%s", c.name, b.String(), c.want)
		}
	}
}

// No line of what is said about the gallery's recipes is wider than a terminal
// of 100 columns, except for file names.
func TestTextWidth(t *testing.T) {
	for _, file := range []string{"blocks", "columns", "data", "long_line", "nested", "references", "select"} {
		_, ds := Load("testdata/mistakes/"+file+".hcl", testProbes, nil)
		var b strings.Builder
		ds.Text(&b)
		for _, line := range strings.Split(b.String(), "\n") {
			if n := len(characters(line)); n > 100 && !strings.Contains(line, "testdata/") {
				t.Errorf("%s: %d characters: %s", file, n, line)
			}
		}
	}
}

func TestJSON(t *testing.T) {
	_, ds := Load("testdata/mistakes/tabs.hcl", testProbes, nil)
	b, err := json.Marshal(ds[len(ds)-1])
	if err != nil {
		t.Fatal(err)
	}
	const want = `{"severity":"error","file":"testdata/mistakes/tabs.hcl","line":4,"column":1,"end_line":4,"end_column":11,"summary":"there is no block object_é_ñ",` +
		`"hint":"Possible here: object, cosmology, sampling, nuisance, reported, xray, lensing, dynamics or reconcile.","source":"object_é_ñ \"x\" {}"}`
	if string(b) != want {
		t.Errorf("%s\nwant\n%s", b, want)
	}
}

func TestNearest(t *testing.T) {
	words := []string{"redshift", "centre", "hubble_constant", "omega_matter", "omega_lambda", "tangential-shear", "virial"}
	for _, c := range []struct{ name, want string }{
		{"redshfit", "redshift"}, {"Redshift", "redshift"}, {"center", "centre"}, {"H0", "hubble_constant"}, {"z", "redshift"},
		{"omega_m", "omega_matter"}, {"tangential_shear", "tangential-shear"}, {"tangentialshear", "tangential-shear"},
		{"viral", "virial"}, {"caustic", ""}, {"x", ""}, {"", ""},
	} {
		if got := nearest(c.name, words); got != c.want {
			t.Errorf("%q: %q, want %q", c.name, got, c.want)
		}
	}
}
