package recipes

import (
	"io"
	"os"
	"path/filepath"
	"testing"
)

// FuzzLoad reads arbitrary recipes: nothing may panic or hang, an error must
// come without a recipe and a recipe without an error, and everything said must
// point into the file.
func FuzzLoad(f *testing.F) {
	seeds, err := filepath.Glob("testdata/*/*.hcl")
	if err != nil || len(seeds) == 0 {
		f.Fatalf("no seeds: %v", err)
	}
	for _, seed := range seeds {
		content, err := os.ReadFile(seed)
		if err != nil {
			f.Fatal(err)
		}
		f.Add(content)
	}
	f.Add([]byte("a = \"${\"${\"${1}\"}\"}\"\n"))
	f.Add([]byte("include = [\"recipe.hcl\", \"/\", \"\\u0000\"]"))
	f.Add([]byte("dynamics \"a\" {\n galaxies {\n select = \"a[0] < 'x' && -b.c ** 2 > \\\"1 Mpc\\\"\"\n}\n}"))
	folder := f.TempDir()
	f.Fuzz(func(t *testing.T, content []byte) {
		file := filepath.Join(folder, "recipe.hcl")
		if err := os.WriteFile(file, content, 0o644); err != nil {
			t.Fatal(err)
		}
		recipe, ds := Load(file, testProbes, nil)
		if (recipe == nil) != ds.HasErrors() {
			t.Fatalf("recipe %v with diagnostics %v", recipe, ds)
		}
		for _, d := range ds {
			if d.Summary == "" || d.File == "" || d.Line < 0 || d.Line > 0 && (d.Column < 1 || d.EndLine < d.Line || d.EndLine == d.Line && d.EndColumn < d.Column) {
				t.Errorf("misplaced: %+v", d)
			}
		}
		if err := ds.Text(io.Discard); err != nil {
			t.Error(err)
		}
	})
}

// FuzzSelect compiles arbitrary conditions and evaluates them.
func FuzzSelect(f *testing.F) {
	for _, seed := range []string{
		"zphot > 0.4 && flag == 0", "!(a == 'x') || b / c < '2 Mpc'", "column('a b') != \"q\"", "mag-2 > 1", "1 < a < 2", "a - -b <= 1e3 * (c + 2)", "a and b", "'", "\\",
	} {
		f.Add(seed)
	}
	f.Fuzz(func(t *testing.T, text string) {
		p, ds := compileSelect(text)
		if (p == nil) != ds.HasErrors() {
			t.Fatalf("%q: predicate %v with %v", text, p, ds)
		}
		if p == nil {
			return
		}
		p, err := p.WithDistance(1e6).Bind(func(string) string { return "arcmin" })
		if err != nil {
			return
		}
		for _, value := range []any{1.5, "late"} {
			row := make([]any, len(p.Names()))
			for i := range row {
				row[i] = value
			}
			p.Keep(row)
		}
	})
}
