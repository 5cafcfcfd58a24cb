package main

import (
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
)

// dunlin writes the recipe that the README shows, with few draws to be quick and
// with data of the form it names, and returns it.
func dunlin(t *testing.T) string {
	t.Helper()
	b, err := os.ReadFile("../../README.md")
	if err != nil {
		t.Fatal(err)
	}
	recipes := regexp.MustCompile("(?s)```hcl\n(.*?)```").FindAllSubmatch(b, -1)
	if len(recipes) != 1 {
		t.Fatalf("%d recipes in the README", len(recipes))
	}
	dir := t.TempDir()
	for name, content := range map[string]string{
		"recipe.hcl": string(recipes[0][1]) + "\nsampling { draws = 200 }\n",
		"shear.csv":  "r_in,r_out,g_t,g_t_err\n1,2,0.13,0.03\n2,4,0.075,0.02\n4,8,0.041,0.012\n8,14,0.017,0.009\n",
	} {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(content), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	return filepath.Join(dir, "recipe.hcl")
}

// The recipe that the README shows can be weighed.
func TestReadmeRecipe(t *testing.T) {
	w := weighed(t, "--cache", t.TempDir(), dunlin(t))
	if len(w.Estimates) != 2 || len(w.Tensions) != 2 {
		t.Errorf("%d estimates, %d tensions", len(w.Estimates), len(w.Tensions))
	}
}

// The commands that the README lists are those that the program has.
func TestReadmeListsTheCommands(t *testing.T) {
	b, err := os.ReadFile("../../README.md")
	if err != nil {
		t.Fatal(err)
	}
	out, _ := succeed(t)
	listed := 0
	for _, m := range regexp.MustCompile("(?m)^\\| `steelyard ([a-z]+)").FindAllStringSubmatch(string(b), -1) {
		listed++
		if !regexp.MustCompile(`(?m)^  ` + m[1] + ` `).MatchString(out) {
			t.Errorf("the program does not list %s:\n%s", m[1], out)
		}
	}
	if has := strings.Count(out, "\n  "); listed < 3 || has < listed {
		t.Errorf("%d commands in the README", listed)
	}
}
