package recipes

import (
	"math"
	"slices"
	"strings"
	"testing"

	"github.com/hashicorp/hcl/v2"
)

// compileSelect compiles a condition as it stands between the quotes of a
// recipe, beside columns r in arcmin and kT in keV.
func compileSelect(text string) (*Predicate, Diagnostics) {
	l := &loader{report: newReport()}
	l.file("recipe.hcl", []byte("select = \""+text+"\"\n"))
	content := l.texts["recipe.hcl"]
	at := hcl.Range{Filename: "recipe.hcl", Start: content.place(9), End: content.place(len(text) + 11)}
	inside := hcl.Range{Filename: "recipe.hcl", Start: content.place(10), End: content.place(len(text) + 10)}
	p := l.predicate(term{kind: textTerm, at: at, inside: inside, text: text}, []Column{{Name: "r", Unit: "arcmin"}, {Name: "kT", Unit: "keV"}})
	return p, l.diagnostics()
}

func TestSelect(t *testing.T) {
	nan := math.NaN()
	for _, c := range []struct {
		text  string
		names []string
		row   []any
		keep  bool
	}{
		{"zphot > 0.4 && flag == 0", []string{"zphot", "flag"}, []any{0.5, 0.0}, true},
		{"zphot > 0.4 && flag == 0", []string{"zphot", "flag"}, []any{0.5, 1.0}, false},
		{"zphot > 0.4 && flag == 0", []string{"zphot", "flag"}, []any{0.4, 0.0}, false},
		{"a || b == 1", nil, nil, false}, // a is no condition: does not compile
		{"a == 1 || b == 1", []string{"a", "b"}, []any{0.0, 1.0}, true},
		{"!(a == 1)", []string{"a"}, []any{0.0}, true},
		{"a + 2 * b - c / 4 == 1 + 2 * 3 - 8 / 4", []string{"a", "b", "c"}, []any{1.0, 3.0, 8.0}, true},
		{"(a + 2) * b == 9", []string{"a", "b"}, []any{1.0, 3.0}, true},
		{"a - 2 - 1 == 0", []string{"a"}, []any{3.0}, true}, // from the left
		{"-a < 0", []string{"a"}, []any{3.0}, true},
		{"a != b", []string{"a", "b"}, []any{1.0, 2.0}, true},
		{"a != b", []string{"a", "b"}, []any{"x", "x"}, false},
		{"type == 'late' && a >= 1 && a <= 1", []string{"type", "a"}, []any{"late", 1.0}, true},
		{"type != 'late'", []string{"type"}, []any{"early"}, true},
		{"'late' == type", []string{"type"}, []any{"late"}, true},
		{"column('B-V') > 0.9", []string{"B-V"}, []any{1.0}, true},
		{"a > 1 && a < 3 && a > 0", []string{"a"}, []any{2.0}, true},

		// A missing value fulfils nothing, and its negation neither.
		{"a > 1", []string{"a"}, []any{nan}, false},
		{"!(a > 1)", []string{"a"}, []any{nan}, false},
		{"a != 1", []string{"a"}, []any{nan}, false},
		{"a == b", []string{"a", "b"}, []any{nan, nan}, false},
		{"a > 1 || b > 1", []string{"a", "b"}, []any{nan, 2.0}, true},
		{"a > 1 || b > 1", []string{"a", "b"}, []any{2.0, nan}, true},
		{"!(a > 1 && b > 1)", []string{"a", "b"}, []any{nan, 0.0}, true},
		{"!(a > 1 && b > 1)", []string{"a", "b"}, []any{nan, 2.0}, false},
		{"a / b > 5", []string{"a", "b"}, []any{1.0, 0.0}, false}, // no infinite signal to noise
		{"a / b < 5", []string{"a", "b"}, []any{1.0, 0.0}, false},

		// Quantities, in the units the recipe states.
		{"r < '2 arcmin'", []string{"r"}, []any{1.9}, true},
		{"r < '90 arcsec'", []string{"r"}, []any{1.6}, false},
		{"'5000 eV' <= kT", []string{"kT"}, []any{5.0}, true},
	} {
		p, ds := compileSelect(c.text)
		if c.names == nil {
			if p != nil || !ds.HasErrors() {
				t.Errorf("%s: compiled", c.text)
			}
			continue
		}
		if p == nil {
			t.Errorf("%s: %v", c.text, ds)
			continue
		}
		if !slices.Equal(p.Names(), c.names) {
			t.Errorf("%s: columns %q, want %q", c.text, p.Names(), c.names)
		}
		keep, err := p.Keep(c.row)
		if err != nil || keep != c.keep {
			t.Errorf("%s of %v: %v, %v; want %v", c.text, c.row, keep, err, c.keep)
		}
	}
}

// Every condition of two comparisons, on every pair of values: against Go's own
// operators.
func TestSelectAgainstGo(t *testing.T) {
	values := []float64{-1.5, 0, 0.25, 3}
	compares := map[string]func(x, y float64) bool{
		"==": func(x, y float64) bool { return x == y }, "!=": func(x, y float64) bool { return x != y },
		"<": func(x, y float64) bool { return x < y }, "<=": func(x, y float64) bool { return x <= y },
		">": func(x, y float64) bool { return x > y }, ">=": func(x, y float64) bool { return x >= y },
	}
	joins := map[string]func(x, y bool) bool{"&&": func(x, y bool) bool { return x && y }, "||": func(x, y bool) bool { return x || y }}
	for first, f := range compares {
		for second, g := range compares {
			for join, h := range joins {
				text := "a " + first + " b * 2 " + join + " !(b " + second + " 0.25)"
				p, ds := compileSelect(text)
				if p == nil {
					t.Fatalf("%s: %v", text, ds)
				}
				for _, a := range values {
					for _, b := range values {
						want := h(f(a, b*2), !g(b, 0.25))
						if got, err := p.Keep([]any{a, b}); err != nil || got != want {
							t.Errorf("%s for %g, %g: %v, %v; want %v", text, a, b, got, err, want)
						}
					}
				}
			}
		}
	}
}

func TestSelectBindsUnits(t *testing.T) {
	p, ds := compileSelect("separation < '2 Mpc' && r > '100 kpc' && kT > '1 keV'")
	if p == nil {
		t.Fatal(ds)
	}
	if got := p.Quantities(); !slices.Equal(got, []string{"separation", "r"}) {
		t.Errorf("quantities %q", got)
	}
	if _, err := p.Keep([]any{1.0, 1.0, 1.0}); err == nil {
		t.Error("an unbound condition was evaluated")
	}
	arcmin := func(string) string { return "arcmin" }
	if _, err := p.Bind(arcmin); err == nil || !strings.Contains(err.Error(), "distance") {
		t.Errorf("a length was compared with an angle without a distance: %v", err)
	}
	if _, err := p.Bind(func(string) string { return "" }); err == nil || !strings.Contains(err.Error(), "separation") {
		t.Errorf("a column without a unit was compared with a quantity: %v", err)
	}
	if _, err := p.WithDistance(1e6).Bind(func(string) string { return "keV" }); err == nil {
		t.Error("a length was compared with an energy")
	}
	// At 10⁶ kpc one arcmin is 10⁶ · π/10800 = 290.888 kpc: 2 Mpc is 6.8755
	// arcmin, 100 kpc is 0.34377 arcmin.
	bound, err := p.WithDistance(1e6).Bind(arcmin)
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		separation, r float64
		keep          bool
	}{{6.875, 0.344, true}, {6.876, 0.344, false}, {6.875, 0.3437, false}} {
		if keep, err := bound.Keep([]any{c.separation, c.r, 2.0}); err != nil || keep != c.keep {
			t.Errorf("separation %g, r %g: %v, %v; want %v", c.separation, c.r, keep, err, c.keep)
		}
	}
	if _, err := p.Keep([]any{1.0, 1.0, 1.0}); err == nil {
		t.Error("Bind changed the predicate it was called on")
	}
}

// Mistakes in the data are errors, not silently dropped rows.
func TestSelectRefusesWrongTypes(t *testing.T) {
	for _, c := range []struct {
		text string
		row  []any
		says string
	}{
		{"flag == '1'", []any{1.0}, "numbers"},
		{"flag == 1", []any{"1"}, "text"},
		{"a == b", []any{1.0, "1"}, "texts"},
		{"a > 0 && a < 1", []any{}, "0 values for 1 columns"},
	} {
		p, ds := compileSelect(c.text)
		if p == nil {
			t.Fatal(ds)
		}
		if keep, err := p.Keep(c.row); err == nil || keep || !strings.Contains(err.Error(), c.says) {
			t.Errorf("%s of %v: %v, %v", c.text, c.row, keep, err)
		}
	}
}

// Places inside the condition are places in the recipe, behind escapes too.
func TestSelectPlaces(t *testing.T) {
	for _, c := range []struct{ raw, marked string }{
		{`a > 1 and b > 2`, `and`},
		{`type == \"late\" && mag-2 > 0`, `mag-2`},
		{`\"é\" == type && log(a) > 1`, `log`},
		{`a = 1`, `=`},
		{`a > .5`, `.`},
		{`a > 1 && b`, `b`},
		{`a > 'x'`, `'x'`},
		{`a > 1 && true`, `true`},
		{`a ** 2 > 1`, `**`},
		{`a <> 1`, `<>`},
		{`a => 1`, `=>`},
		{`a ≥ 1`, `≥`},
		{`1 < a < 2`, `1 < a < 2`},
		{`a.b > 1`, `a.b`},
		{`a + 'x' > 1`, `'x'`},
		{`!a`, `!a`},
		{`a > '2 +- 1 kpc'`, `'2 +- 1 kpc'`},
		{`a > '2'`, `'2'`},
		{`1 > 2`, `1 > 2`},
	} {
		l := &loader{report: newReport(), probes: testProbes}
		source := "select = \"" + c.raw + "\"\n"
		l.file("recipe.hcl", []byte(source))
		content := l.texts["recipe.hcl"]
		at := hcl.Range{Filename: "recipe.hcl", Start: content.place(9), End: content.place(len(source) - 1)}
		inside := hcl.Range{Filename: "recipe.hcl", Start: content.place(10), End: content.place(len(source) - 2)}
		l.predicate(term{kind: textTerm, at: at, inside: inside, text: strings.ReplaceAll(c.raw, `\"`, `"`)}, nil)
		ds := l.diagnostics()
		if len(ds) != 1 {
			t.Errorf("%s: %d diagnostics: %v", c.raw, len(ds), ds)
			continue
		}
		cells := characters(source)
		if got := strings.Join(cells[ds[0].Column-1:ds[0].EndColumn-1], ""); got != c.marked {
			t.Errorf("%s: marks %q, want %q (%s)", c.raw, got, c.marked, ds[0].Summary)
		}
		if ds[0].Hint == "" && ds[0].Detail == "" {
			t.Errorf("%s: %q says nothing of what to write", c.raw, ds[0].Summary)
		}
	}
}

func BenchmarkSelect(b *testing.B) {
	p, _ := compileSelect("zphot > 0.4 && flag == 0 && (mag < 24 || weight / error > 5)")
	row := []any{0.5, 0.0, 25.0, 1.0, 0.1}
	for b.Loop() {
		if keep, err := p.Keep(row); err != nil || !keep {
			b.Fatal(keep, err)
		}
	}
}
