package main

import (
	"bytes"
	"context"
	"encoding/json"
	"io/fs"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"steelyard/engine/weighing"
)

const example = "../../recipes/examples/curlew"

// steelyard runs the program as a user would.
func steelyard(t *testing.T, args ...string) (status int, stdout, stderr string) {
	t.Helper()
	var out, err bytes.Buffer
	status = run(context.Background(), args, &out, &err)
	return status, out.String(), err.String()
}

// succeed runs the program and fails the test unless it exits with 0.
func succeed(t *testing.T, args ...string) (stdout, stderr string) {
	t.Helper()
	status, stdout, stderr := steelyard(t, args...)
	if status != exitDone {
		t.Fatalf("steelyard %s: exit status %d\n%s%s", strings.Join(args, " "), status, stdout, stderr)
	}
	return stdout, stderr
}

// curlew copies the example, with fewer draws to be quick, and returns its
// recipe.
func curlew(t *testing.T) string {
	t.Helper()
	dir := t.TempDir()
	if err := os.CopyFS(dir, os.DirFS(example)); err != nil {
		t.Fatal(err)
	}
	recipe := filepath.Join(dir, "recipe.hcl")
	edit(t, recipe, "draws = 4000", "draws = 300")
	return recipe
}

// edit replaces a text that a file must have.
func edit(t *testing.T, file, from, to string) {
	t.Helper()
	b, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Contains(b, []byte(from)) {
		t.Fatalf("%s does not have %q", file, from)
	}
	if err := os.WriteFile(file, bytes.Replace(b, []byte(from), []byte(to), 1), 0o644); err != nil {
		t.Fatal(err)
	}
}

// weighed runs weigh --json on one recipe.
func weighed(t *testing.T, args ...string) *weighing.Weighing {
	t.Helper()
	out, _ := succeed(t, append([]string{"weigh", "--json", "--quiet"}, args...)...)
	var w weighing.Weighing
	if err := json.Unmarshal([]byte(out), &w); err != nil {
		t.Fatalf("%v in %q", err, out)
	}
	return &w
}

// The masses of the example agree with the truth its data were made from: the
// compared estimates within 2.6 standard deviations of ln M, which one in a
// hundred misses by chance.
func TestExampleAgreesWithItsTruth(t *testing.T) {
	b, err := os.ReadFile(filepath.Join(example, "truth.json"))
	if err != nil {
		t.Fatal(err)
	}
	var truth struct {
		Masses []struct{ Overdensity, Mass float64 }
	}
	if err := json.Unmarshal(b, &truth); err != nil {
		t.Fatal(err)
	}
	w := weighed(t, "--cache", t.TempDir(), filepath.Join(example, "recipe.hcl"))
	checked := 0
	for _, e := range w.Estimates {
		if e.Name == "reported.earlier_shear" {
			continue // a value invented apart from the data
		}
		for _, own := range e.Own {
			for _, m := range truth.Masses {
				if m.Overdensity != own.Overdensity || own.Of != "critical" {
					continue
				}
				checked++
				off := math.Log(own.Mass.Median / m.Mass)
				sd := math.Log(own.Mass.Hi/own.Mass.Lo) / 2
				if math.Abs(off) > 2.6*sd {
					t.Errorf("%s: M_%g is off by %.2f in ln M, %.1f of its errors", e.Name, own.Overdensity, off, off/sd)
				}
			}
		}
	}
	if checked != 12 {
		t.Errorf("%d masses were checked, want three of four estimates", checked)
	}
	for _, c := range w.Consistency {
		if c.Verdict != "consistent" {
			t.Errorf("data of one halo are %s at %s", c.Verdict, c.At)
		}
	}
}

// A second weighing computes nothing and prints the same, and neither a comment,
// a touched file, another spelling of a unit nor another number of workers
// changes that.
func TestNothingIsComputedTwice(t *testing.T) {
	recipe, store := curlew(t), t.TempDir()
	first, log := succeed(t, "weigh", "--cache", store, "--workers", "1", recipe)
	if !strings.Contains(log, " computed") || strings.Contains(log, "reused") {
		t.Errorf("the first weighing did not compute everything: %s", log)
	}
	for name, change := range map[string]func(){
		"nothing":           func() {},
		"a comment":         func() { edit(t, recipe, "lensing \"shapes\"", "# another comment\nlensing \"shapes\"") },
		"a unit's spelling": func() { edit(t, recipe, `"0.25 Mpc"`, `"250 kpc"`) },
		"a touched file": func() {
			now := time.Now()
			if err := os.Chtimes(filepath.Join(filepath.Dir(recipe), "shapes.fits"), now, now); err != nil {
				t.Fatal(err)
			}
		},
	} {
		change()
		again, log := succeed(t, "weigh", "--cache", store, "--workers", "8", recipe)
		if strings.Contains(log, "computed") {
			t.Errorf("after %s: %s", name, log)
		}
		if again != first {
			t.Errorf("after %s the output differs", name)
		}
	}
	fresh, _ := succeed(t, "weigh", "--cache", t.TempDir(), "--workers", "8", recipe)
	if fresh != first {
		t.Error("eight workers give other digits than one")
	}
}

// One changed temperature costs the X-ray nodes and the comparison, nothing
// else.
func TestOnlyWhatDependsIsComputed(t *testing.T) {
	recipe, store := curlew(t), t.TempDir()
	weighed(t, "--cache", store, recipe)
	edit(t, filepath.Join(filepath.Dir(recipe), "temperature.csv"), "1.1,1.6,6.53", "1.1,1.6,6.63")
	w := weighed(t, "--cache", store, recipe)
	for _, n := range w.Nodes {
		depends := n.ID == "xray.spectra.temperature.table" || n.ID == "xray.spectra.temperature.reduced" ||
			strings.HasPrefix(n.ID, "xray.spectra.backward") || strings.HasPrefix(n.ID, "reconcile.")
		if depends != (n.State == "computed") {
			t.Errorf("%s was %s", n.ID, n.State)
		}
	}
}

// An estimate that fails is said to, blocks the comparison that needs it, and
// leaves the others their masses.
func TestOneFailureLetsTheRestFinish(t *testing.T) {
	recipe := curlew(t)
	edit(t, filepath.Join(filepath.Dir(recipe), "temperature.csv"), "1.1,1.6,6.53", "1.1,1.6,-6.53")
	status, out, log := steelyard(t, "weigh", "--cache", t.TempDir(), recipe)
	if status != exitFailed {
		t.Errorf("exit status %d, want %d", status, exitFailed)
	}
	for _, want := range []string{"lensing.shapes.nfw", "dynamics.redshifts.scaling", "temperature.csv", "row 4"} {
		if !strings.Contains(out, want) {
			t.Errorf("the output does not have %q:\n%s", want, out)
		}
	}
	if !strings.Contains(log, "blocked") {
		t.Errorf("the log does not say that something is blocked: %s", log)
	}
}

func TestExitStatuses(t *testing.T) {
	recipe, store := dunlin(t), t.TempDir()
	missing := filepath.Join(t.TempDir(), "missing.hcl")
	broken := filepath.Join(t.TempDir(), "broken.hcl")
	if err := os.WriteFile(broken, []byte("object \"A\" {\n  redshift = -1\n}\n"), 0o644); err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		args []string
		want int
		say  string
	}{
		{[]string{"weigh", recipe}, exitDone, ""},
		{[]string{"weigh", "--fail-above", "0.0001", recipe}, exitTension, "above the 0.0001 allowed"},
		{[]string{"weigh", "--fail-above", "30", recipe}, exitDone, ""},
		{[]string{"weigh", "--fail-above", "-1", recipe}, exitWrong, "positive"},
		{[]string{"weigh", missing}, exitWrong, "does not exist"},
		{[]string{"weigh", broken}, exitWrong, "redshift"},
		{[]string{"weigh"}, exitWrong, "arg"},
		{[]string{"wiegh", recipe}, exitWrong, "unknown command"},
		{[]string{"weigh", "--wokers", "2", recipe}, exitWrong, "unknown flag"},
		{[]string{"weigh", "--workers", "0", recipe}, exitWrong, "at least one"},
		{[]string{"methods", "alchemy"}, exitWrong, "there is no method"},
		{[]string{"methods", "tangential-shear"}, exitDone, ""},
		{[]string{"methods"}, exitDone, ""},
		{[]string{"inspect", recipe}, exitDone, ""},
		{[]string{"trace", recipe, "lensing.shear.nfw"}, exitDone, ""},
		{[]string{"trace", recipe, "lensing.shear.nwf"}, exitWrong, "did you mean lensing.shear.nfw?"},
		{[]string{"trace", recipe, "nonsense"}, exitWrong, "steelyard inspect lists the nodes"},
		{[]string{"trace", recipe, "reconcile", "--json", "--prov"}, exitWrong, "leave --json away"},
		{[]string{"trace", recipe, "reconcile", "--weighing", "7"}, exitWrong, "there is no weighing 7"},
		{[]string{"trace", recipe}, exitWrong, "arg"},
		{[]string{"trace", missing, "reconcile"}, exitFailed, "no weighing of " + missing},
		{[]string{"trace", recipe + "l", "reconcile"}, exitFailed, "did you mean " + recipe + "?"},
		{[]string{"since", recipe}, exitFailed, "is the first on record"},
		{[]string{"since", recipe, "--list"}, exitDone, ""},
		{[]string{"since", recipe, "--list", "--from", "1"}, exitWrong, "leave --from"},
		{[]string{"since", recipe, "--from", "soon"}, exitWrong, "--from soon"},
		{[]string{"since", recipe, "--to", "0"}, exitWrong, "--to 0: there is no weighing 0"},
		{[]string{"cache"}, exitDone, ""},
		{[]string{"cache", "sice"}, exitWrong, "unknown command"},
		{[]string{"cache", "size"}, exitDone, ""},
		{[]string{"cache", "size", "now"}, exitWrong, "unknown command"},
		{[]string{"cache", "check"}, exitDone, ""},
		{[]string{"cache", "check", recipe}, exitWrong, "--recompute"},
		{[]string{"cache", "check", "--recompute", "2"}, exitWrong, "needs recipes"},
		{[]string{"cache", "check", "--recompute", "0", recipe}, exitWrong, "at least one"},
		{[]string{"cache", "trim"}, exitWrong, "say what to remove"},
		{[]string{"cache", "trim", "--unused-for", "3y"}, exitWrong, "36h, 90d or 12w"},
		{[]string{"cache", "trim", "--down-to", "-1GB"}, exitWrong, "500MB or 2GB"},
		{[]string{"cache", "trim", recipe + "x"}, exitWrong, "did you mean " + recipe + "?"},
		{[]string{"cache", "absorb"}, exitWrong, "arg"},
		{[]string{"cache", "absorb", missing}, exitFailed, "there is no store in"},
	} {
		status, _, log := steelyard(t, append(c.args, "--cache", store)...)
		if status != c.want || !strings.Contains(log, c.say) {
			t.Errorf("steelyard %s: exit status %d, want %d saying %q:\n%s", strings.Join(c.args, " "), status, c.want, c.say, log)
		}
	}
}

// Inspect stores and computes nothing.
func TestInspectLeavesTheStoreAlone(t *testing.T) {
	recipe, store := dunlin(t), t.TempDir()
	out, _ := succeed(t, "inspect", "--cache", store, recipe)
	if !strings.Contains(out, "to compute") {
		t.Errorf("nothing is to compute:\n%s", out)
	}
	files := 0
	err := filepath.WalkDir(store, func(_ string, e fs.DirEntry, err error) error {
		if err == nil && !e.IsDir() {
			files++
		}
		return err
	})
	if err != nil || files > 0 {
		t.Errorf("inspect left %d files in the store (%v)", files, err)
	}
	weighed(t, "--cache", store, recipe)
	if out, _ = succeed(t, "inspect", "--cache", store, recipe); strings.Contains(out, "to compute") {
		t.Errorf("after weighing there is still something to compute:\n%s", out)
	}
	edit(t, recipe, "draws = 200", "draws = 210")
	if out, _ = succeed(t, "inspect", "--cache", store, recipe); !strings.Contains(out, "draws: 200 → 210") {
		t.Errorf("the reason is not given:\n%s", out)
	}
}

// Several recipes share what they have in common; with --json each prints one
// line, in order.
func TestSeveralRecipes(t *testing.T) {
	first, second, store := dunlin(t), dunlin(t), t.TempDir()
	edit(t, second, "Dunlin", "Sanderling")
	edit(t, second, "normal(0.0, 0.02)", "normal(0.0, 0.03)")
	broken := filepath.Join(t.TempDir(), "broken.hcl")
	if err := os.WriteFile(broken, []byte("object {}\n"), 0o644); err != nil {
		t.Fatal(err)
	}
	status, out, log := steelyard(t, "weigh", "--json", "--cache", store, first, broken, second)
	if status != exitWrong || !strings.Contains(log, "broken.hcl was not weighed") {
		t.Errorf("exit status %d: %s", status, log)
	}
	lines := strings.Split(strings.TrimSpace(out), "\n")
	if len(lines) != 2 {
		t.Fatalf("%d lines", len(lines))
	}
	for i, want := range []string{"Dunlin", "Sanderling"} {
		var w weighing.Weighing
		if err := json.Unmarshal([]byte(lines[i]), &w); err != nil {
			t.Fatal(err)
		}
		if w.Object.Name != want {
			t.Errorf("line %d is about %s", i+1, w.Object.Name)
		}
		for _, n := range w.Nodes {
			if shared := strings.HasPrefix(n.ID, "reported.") || strings.HasPrefix(n.ID, "lensing.shear.profile"); i == 1 && shared != (n.State == "reused") {
				t.Errorf("%s was %s", n.ID, n.State)
			}
		}
	}
}

// The texts of the example fit a terminal of 100 columns, and say what is in a
// node's key in the words of the recipe.
func TestTextsFitTheTerminal(t *testing.T) {
	recipe, store := curlew(t), t.TempDir()
	var texts []string
	show := func(args ...string) {
		out, _ := succeed(t, append(args, "--cache", store)...)
		texts = append(texts, out)
	}
	show("weigh", recipe)
	edit(t, recipe, "concentration = lognormal(4.5, 0.3)", "concentration = relation(\"duffy-2008\")")
	edit(t, recipe, "count = 10", "count = 8")
	edit(t, recipe, "zphot < 3", "zphot < 2.5")
	show("weigh", recipe)
	show("since", recipe)
	for _, name := range []string{"reconcile", "reported.earlier_shear", "dynamics.redshifts.virial"} {
		show("trace", recipe, name)
	}
	other := dunlin(t)
	show("weigh", other)
	edit(t, other, "hubble_constant = \"70 km/s/Mpc\"", "hubble_constant = \"68 km/s/Mpc\"")
	edit(t, other, "radii_from = lensing.shear.nfw", "radii_from = \"own\"")
	edit(t, other, "column(\"g_t_err\")", "column(\"g_t\")")
	show("weigh", other)
	show("since", other)
	for _, text := range texts {
		for _, line := range strings.Split(text, "\n") {
			if n := len([]rune(line)); n > 100 && !strings.Contains(line, "sha256") {
				t.Errorf("%d columns: %s", n, line)
			}
			for _, raw := range []string{"exact(", "unit \"", "nuisance \"", "length true", "present", "two_piece"} {
				if strings.Contains(line, raw) {
					t.Errorf("%q is of the key, not for people: %s", raw, line)
				}
			}
		}
	}
	if n := strings.Count(texts[2], "\n"); n > 45 {
		t.Errorf("since takes %d lines:\n%s", n, texts[2])
	}
}
