package main

import (
	"go/parser"
	"go/token"
	"io/fs"
	"path"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
)

const module = "steelyard/"

// The direction of the arrows between packages: what each may import of this
// project. A package that is not listed here has no place in the structure yet.
var (
	leaves = []string{"probes/constants", "probes/method", "probes/prior", "probes/units", "probes/wire"}
	ground = []string{"probes/catalogue", "probes/cosmology", "probes/estimate", "probes/halo", "probes/infer"}
	allow  = map[string][]string{
		"probes/constants": nil,
		"probes/prior":     nil,
		"probes/units":     {"probes/constants"},
		"probes/wire":      nil,
		"probes/method":    {"probes/prior"},

		"probes/cosmology": leaves,
		"probes/infer":     leaves,
		"probes/catalogue": leaves,
		"probes/halo":      join(leaves, []string{"probes/cosmology"}),
		"probes/estimate":  join(leaves, ground),

		"probes/xray":      join(leaves, ground),
		"probes/lensing":   join(leaves, ground),
		"probes/dynamics":  join(leaves, ground),
		"probes/reported":  join(leaves, ground),
		"probes/reconcile": join(leaves, ground),
		// What invents data must not share the estimators' formulae.
		"probes/mock": {"probes/constants"},

		"recipes": {"probes/method", "probes/prior", "probes/units"},

		"cache":           nil,
		"engine":          {"cache"},
		"engine/layout":   nil,
		"engine/history":  {"cache", "engine", "engine/layout", "engine/weighing"},
		"engine/weighing": {"engine/layout"},
		"engine/assemble": join(leaves, ground, []string{"engine", "engine/weighing", "recipes",
			"probes/xray", "probes/lensing", "probes/dynamics", "probes/reported", "probes/reconcile"}),
	}
)

func join(sets ...[]string) []string { return slices.Concat(sets...) }

func TestArrowsPointOneWay(t *testing.T) {
	const root = "../.."
	files := 0
	err := filepath.WalkDir(root, func(name string, entry fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		if entry.IsDir() && strings.HasPrefix(entry.Name(), ".") && entry.Name() != ".." {
			return fs.SkipDir
		}
		if !strings.HasSuffix(name, ".go") {
			return nil
		}
		relative, err := filepath.Rel(root, name)
		if err != nil {
			return err
		}
		pkg := path.Dir(filepath.ToSlash(relative))
		if strings.HasPrefix(pkg, "cmd/") {
			return nil
		}
		allowed, known := allow[pkg]
		if !known {
			t.Errorf("%s: the package %s has no place in the structure; give it one here and in DEVELOPERS.md", relative, pkg)
			return nil
		}
		files++
		// Tests may look further: an estimator is tested on invented data.
		if strings.HasSuffix(name, "_test.go") {
			allowed = join(allowed, []string{"probes/mock", pkg}, leaves, ground)
			if strings.HasPrefix(pkg, "engine/") {
				allowed = join(allowed, []string{"cache"})
			}
		}
		f, err := parser.ParseFile(token.NewFileSet(), name, nil, parser.ImportsOnly)
		if err != nil {
			return err
		}
		for _, imported := range f.Imports {
			to, err := strconv.Unquote(imported.Path.Value)
			if err != nil {
				return err
			}
			if inside, ok := strings.CutPrefix(to, module); ok && !slices.Contains(allowed, inside) {
				t.Errorf("%s imports %s, against the direction of the arrows", relative, inside)
			}
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	if files < 50 {
		t.Errorf("only %d files were read: the walk does not see the project", files)
	}
}
