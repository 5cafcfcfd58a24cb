package main

import (
	"encoding/json"
	"path/filepath"
	"strings"
	"testing"

	"steelyard/engine/history"
)

// since compares the last two weighings that differ, or those that were asked
// for, and weighing again without a change is not one of them.
func TestSince(t *testing.T) {
	recipe, store := dunlin(t), t.TempDir()
	_, log := succeed(t, "weigh", "--cache", store, recipe)
	if !strings.Contains(log, "recorded as weighing 1\n") {
		t.Errorf("the log: %s", log)
	}
	edit(t, recipe, "normal(0.0, 0.02)", "normal(0.0, 0.05)")
	weighed(t, "--cache", store, recipe)
	edit(t, filepath.Join(filepath.Dir(recipe), "shear.csv"), "0.075", "0.085")
	weighed(t, "--cache", store, recipe)
	if _, log = succeed(t, "weigh", "--cache", store, recipe); !strings.Contains(log, "nothing new since weighing 3 of ") {
		t.Errorf("the log: %s", log)
	}
	for _, c := range []struct {
		args             []string
		from, to         uint64
		files, assumes   int
		want, wantNotHas string
	}{
		{nil, 2, 3, 1, 0, "shear.csv: content", "shear_bias"},
		{[]string{"--from", "1"}, 1, 3, 1, 1, "lensing.shear.nfw.shear_bias: normal(0, 0.02) → normal(0, 0.05)", "Nothing changed"},
		{[]string{"--from", "1", "--to", "2"}, 1, 2, 0, 1, "shear_bias", "shear.csv"},
		{[]string{"--to", "2"}, 1, 2, 0, 1, "Masses that did not move: reported.gas", "shear.csv"},
		{[]string{"--from", "2100-01-01"}, 3, 3, 0, 0, "Nothing changed", "shear.csv"},
	} {
		args := append([]string{"since", recipe, "--cache", store}, c.args...)
		text, _ := succeed(t, args...)
		if !strings.Contains(text, c.want) || strings.Contains(text, c.wantNotHas) {
			t.Errorf("since %v:\n%s", c.args, text)
		}
		out, _ := succeed(t, append(args, "--json")...)
		var x history.Comparison
		if err := json.Unmarshal([]byte(out), &x); err != nil {
			t.Fatal(err)
		}
		if x.Schema != "steelyard/since/1" || x.From.Number != c.from || x.To.Number != c.to || len(x.Files) != c.files || len(x.Assumptions) != c.assumes {
			t.Errorf("since %v: %s", c.args, out)
		}
	}
	if out, _ := succeed(t, "since", recipe, "--cache", store, "--list"); strings.Count(out, "\n") != 3 {
		t.Errorf("the list:\n%s", out)
	}
	if out, _ := succeed(t, "since", recipe, "--cache", store, "--list", "--json"); strings.Count(out, "steelyard/weighing-mark/1") != 3 {
		t.Errorf("the list:\n%s", out)
	}
}

// A number is followed up to its files; when the recipe has changed since, the
// trace says so, and when it cannot be read any more, too.
func TestTrace(t *testing.T) {
	recipe, store := dunlin(t), t.TempDir()
	weighed(t, "--cache", store, recipe)
	edit(t, recipe, "normal(0.0, 0.02)", "normal(0.0, 0.05)")
	w := weighed(t, "--cache", store, recipe)
	out, _ := succeed(t, "trace", "--json", "--cache", store, recipe, "lensing.shear.nfw")
	var x history.Trace
	if err := json.Unmarshal([]byte(out), &x); err != nil {
		t.Fatal(err)
	}
	digests := map[string]string{}
	for _, n := range w.Nodes {
		digests[n.ID] = n.Digest
	}
	if len(x.Nodes) != 4 || x.Stale != "" || x.Weighing.Number != 2 {
		t.Errorf("the trace: %s", out)
	}
	for _, n := range x.Nodes {
		if n.Output != digests[n.ID] || n.Computed == nil || n.Computed.Program != version() {
			t.Errorf("%s: %+v", n.ID, n)
		}
	}
	if said := x.Nodes[0].Computed.Diagnostics; len(said) != 1 || said[0] != "4 rows" {
		t.Errorf("the table says %q", said)
	}
	if said := x.Nodes[2].Computed.Diagnostics; len(said) < 2 || !strings.HasPrefix(said[0], "200 draws by ") {
		t.Errorf("the estimate says %q", said)
	}
	if n := x.Nodes[2]; n.ID != "lensing.shear.nfw" || n.Changed == nil || n.Changed.Facts[0] != (history.Change{Name: "estimate.shear_bias", From: "normal(0, 0.02)", To: "normal(0, 0.05)"}) {
		t.Errorf("what changed: %+v", n.Changed)
	}
	out, _ = succeed(t, "trace", "--json", "--cache", store, recipe, "reconcile")
	if err := json.Unmarshal([]byte(out), &x); err != nil || x.Nodes[len(x.Nodes)-1].ID != "reconcile.tension" {
		t.Errorf("%v: %s", err, out)
	}
	var prov struct{ Activity map[string]any }
	if out, _ = succeed(t, "trace", "--prov", "--cache", store, recipe, "reconcile"); json.Unmarshal([]byte(out), &prov) != nil || len(prov.Activity) != len(x.Nodes) {
		t.Errorf("PROV-JSON: %s", out)
	}
	text := func() string {
		out, _ := succeed(t, "trace", "--cache", store, recipe, "lensing.shear.nfw")
		return out
	}
	const changed, unreadable = "have changed since", "cannot be read as it is now"
	if out := text(); strings.Contains(out, changed) || !strings.Contains(out, "changed   in weighing 2: estimate.shear_bias: normal(0, 0.02) → normal(0, 0.05)") {
		t.Errorf("%s", out)
	}
	edit(t, filepath.Join(filepath.Dir(recipe), "shear.csv"), "0.075", "0.085")
	if out := text(); !strings.Contains(out, changed) {
		t.Errorf("after new data:\n%s", out)
	}
	edit(t, filepath.Join(filepath.Dir(recipe), "shear.csv"), "0.085", "0.075")
	succeed(t, "cache", "trim", "--cache", store, recipe)
	if out := text(); strings.Contains(out, changed) || !strings.Contains(out, "trimmed from the store") {
		t.Errorf("after a trim:\n%s", out)
	}
	edit(t, recipe, "redshift = 0.184", "redshift = ")
	if out := text(); !strings.Contains(out, unreadable) {
		t.Errorf("with a mistake in the recipe:\n%s", out)
	}
}
