package engine

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"pgregory.net/rapid"
)

// prospects describes what Inspect says, a line a node.
func prospects(t testing.TB, g *Graph, o Options, dir string) string {
	t.Helper()
	list, err := Inspect(t.Context(), g, openStore(t, dir), o)
	if err != nil {
		t.Fatal(err)
	}
	var b strings.Builder
	for _, p := range list {
		fmt.Fprintf(&b, "%s %s", p.Node.ID, p.State)
		for _, c := range p.Because {
			fmt.Fprintf(&b, "; %s", c)
		}
		if p.Reason != "" {
			fmt.Fprintf(&b, "; %s", p.Reason)
		}
		if p.Err != nil {
			fmt.Fprintf(&b, "; %v", p.Err)
		}
		b.WriteString("\n")
	}
	return b.String()
}

func TestInspectSaysWhatWouldRunAndWhy(t *testing.T) {
	dir, store := t.TempDir(), filepath.Join(t.TempDir(), "store")
	file := filepath.Join(dir, "data.csv")
	os.WriteFile(file, []byte("1"), 0o666)
	graph := func(version int, param string) *Graph {
		profile := join("profile", "profile", nil, []string{file})
		fit := join("fit", "fit", []string{"profile"}, nil)
		fit.Params = []string{"halo = nfw", "concentration = " + param}
		fit.Version = version
		return mustGraph(t, profile, fit, join("compare", "compare", []string{"fit", "other"}, nil), join("other", "other", nil, nil))
	}
	o := Options{Recipe: "recipe.hcl"}
	check := func(g *Graph, want string) {
		t.Helper()
		got := prospects(t, g, o, store)
		if want = strings.TrimSpace(strings.ReplaceAll(want, "\t", "")) + "\n"; got != want {
			t.Errorf("got\n%swant\n%s", got, want)
		}
	}
	check(graph(1, "4"), `profile to compute; it is not in the store
		fit to compute; it is not in the store
		compare to compute; it is not in the store
		other to compute; it is not in the store`)
	if _, err := os.Stat(store); err == nil {
		t.Error("inspecting made a store")
	}
	mustRun(t, graph(1, "4"), openStore(t, store), o)
	check(graph(1, "4"), "profile reused\nfit reused\ncompare reused\nother reused")
	check(graph(1, "5"), "profile reused\nfit to compute; concentration: 4 → 5\ncompare open\nother reused")
	check(graph(2, "5"), "profile reused\nfit to compute; version: 1 → 2; concentration: 4 → 5\ncompare open\nother reused")

	os.WriteFile(file, []byte("2"), 0o666)
	check(graph(1, "4"), `profile to compute; file `+file+`: 6b86b273ff34 → d4735e3a265e
		fit open
		compare open
		other reused`)
	// A node below an open one that changed itself is to be computed all the same.
	check(graph(1, "5"), `profile to compute; file `+file+`: 6b86b273ff34 → d4735e3a265e
		fit to compute; concentration: 4 → 5
		compare open
		other reused`)
	os.Remove(file)
	check(graph(1, "4"), `profile failed; recipe.hcl:1: profile: cannot read its input: stat `+file+`: no such file or directory
		fit blocked
		compare blocked
		other reused`)
	// Another recipe has no past; what it shares is reused.
	os.WriteFile(file, []byte("2"), 0o666)
	o.Recipe = "another.hcl"
	check(graph(1, "4"), `profile to compute; it is not in the store
		fit to compute; it is not in the store
		compare to compute; it is not in the store
		other reused`)
}

func TestExplainComparesTheLastTwoKeys(t *testing.T) {
	dir := t.TempDir()
	file := filepath.Join(dir, "data.csv")
	os.WriteFile(file, []byte("1"), 0o666)
	s := openStore(t, filepath.Join(dir, "store"))
	o := Options{Recipe: "recipe.hcl", Program: "v1", Now: func() time.Time { return time.Unix(1e9, 0) }}
	explain := func(id string) string {
		last, before, changes, err := Explain(s, o.Recipe, id)
		if err != nil {
			return err.Error()
		}
		if last.Program != "v1" || last.Finished.Unix() != 1e9 || (before == nil) != (changes == nil) {
			t.Errorf("%+v, %+v", last, before)
		}
		return fmt.Sprint(changes)
	}
	if got := explain("b"); got != "the store knows nothing of b: weigh the recipe first" {
		t.Error(got)
	}
	graph := func(a string, inputs ...string) *Graph {
		return mustGraph(t, join("a", a, nil, []string{file}), join("x", "x", nil, nil), join("b", "b", inputs, nil))
	}
	mustRun(t, graph("one", "a"), s, o)
	if got := explain("b"); got != "[]" {
		t.Error(got)
	}
	mustRun(t, graph("two", "a"), s, o)
	if got := explain("a"); got != "[text: one → two]" {
		t.Error(got)
	}
	if got := explain("b"); !strings.HasPrefix(got, "[output of a: ") || !strings.Contains(got, " → ") {
		t.Error(got)
	}
	mustRun(t, graph("two", "a", "x"), s, o)
	if got := explain("b"); !strings.HasPrefix(got, "[output of x is new: ") {
		t.Error(got)
	}
	mustRun(t, graph("two", "x", "a"), s, o)
	if got := explain("b"); got != "[order of the facts: as before → another]" {
		t.Error(got)
	}
	mustRun(t, graph("two"), s, o)
	if got := explain("b"); !strings.HasPrefix(got, "[output of x is gone: ") || !strings.Contains(got, "output of a is gone: ") {
		t.Error(got)
	}
	// Back to what was: reused, and explained all the same.
	mustRun(t, graph("one"), s, o)
	if got := explain("a"); got != "[text: two → one]" {
		t.Error(got)
	}
}

// What Inspect calls reused is reused, what it calls to compute is computed, and
// of what it calls open something is decided only then.
func TestInspectForetellsRun(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		dir, err := os.MkdirTemp("", "steelyard-test")
		if err != nil {
			t.Fatal(err)
		}
		defer os.RemoveAll(dir)
		w := &world{dir: dir, files: make([]int, 2), runs: map[string]int{}}
		for i := range w.files {
			w.write(i, i)
		}
		for range rapid.IntRange(1, 7).Draw(t, "nodes") {
			w.addNode(t)
		}
		store := rapidStore(t, filepath.Join(dir, "kept"))
		defer store.Close()
		for range 3 {
			g := w.graph(t, false)
			list, err := Inspect(t.Context(), g, store, Options{Recipe: "test"})
			if err != nil {
				t.Fatal(err)
			}
			r := rapidRun(t, g, store, 2)
			for _, p := range list {
				got := r.Result(p.Node.ID).State
				// Two nodes that ask the same question are both to compute; one is then reused.
				if p.State == Reused && got != Reused || p.State == Open && got != Reused && got != Computed {
					t.Fatalf("%s was to be %s and is %s", p.Node.ID, p.State, got)
				}
				if p.State == ToCompute && got == Reused && !sharesKey(r, p.Node.ID) && p.Reason == "" && len(p.Because) == 0 {
					t.Fatalf("%s was to be computed without a reason and is reused", p.Node.ID)
				}
				if p.State == Reused && p.Digest != r.Result(p.Node.ID).Digest {
					t.Fatalf("%s came out different", p.Node.ID)
				}
			}
			w.edit(t)
		}
	})
}

func sharesKey(r *Report, id string) bool {
	for _, other := range r.Results() {
		if other.Node.ID != id && other.Key == r.Result(id).Key {
			return true
		}
	}
	return false
}
