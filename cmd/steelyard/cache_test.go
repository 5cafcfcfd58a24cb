package main

import (
	"encoding/json"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"steelyard/cache"
)

func sizeOf(t *testing.T, store string) (s storeSize) {
	t.Helper()
	out, _ := succeed(t, "cache", "size", "--json", "--cache", store)
	if err := json.Unmarshal([]byte(out), &s); err != nil {
		t.Fatal(err)
	}
	return s
}

// What is in the store and for whom; trimmed by recipe, age and size, it really
// becomes smaller, keeps its history, and computes what is missing again to the
// same digits.
func TestCacheSizeAndTrim(t *testing.T) {
	first, second, store := dunlin(t), dunlin(t), t.TempDir()
	edit(t, second, "draws = 200", "draws = 3000")
	if s := sizeOf(t, store); s.Bytes != 0 || s.Records != 0 || len(s.Recipes) != 0 {
		t.Errorf("an empty store: %+v", s)
	}
	before, _ := succeed(t, "weigh", "--cache", store, first)
	nodes := len(weighed(t, "--cache", store, second).Nodes)
	full := sizeOf(t, store)
	if len(full.Recipes) != 2 || full.Weighings != 2 || full.Folder != store || full.Bytes < 500_000 {
		t.Fatalf("%+v", full)
	}
	for _, r := range full.Recipes {
		if r.Nodes != nodes || r.Weighings != 1 || !r.There || r.Used.IsZero() {
			t.Errorf("%+v", r)
		}
	}
	if err := os.Rename(second, second+".old"); err != nil {
		t.Fatal(err)
	}
	text, _ := succeed(t, "cache", "size", "--cache", store)
	if !strings.Contains(text, first) || !strings.Contains(text, second+" (no longer there)") {
		t.Errorf("the text:\n%s", text)
	}
	out, _ := succeed(t, "cache", "trim", "--cache", store, second)
	after := sizeOf(t, store)
	if after.Bytes > full.Bytes/2 || after.Weighings != 2 || after.Records >= full.Records || !strings.Contains(out, "removed "+plural(full.Records-after.Records, "output")) {
		t.Errorf("trimmed from %d to %d bytes, %d weighings are left: %s", full.Bytes, after.Bytes, after.Weighings, out)
	}
	if _, log := succeed(t, "weigh", "--cache", store, first); strings.Contains(log, "computed") {
		t.Errorf("trimming one recipe cost the other its nodes: %s", log)
	}
	if out, _ = succeed(t, "cache", "trim", "--unused-for", "90d", "--cache", store); !strings.Contains(out, "removed 0 outputs") {
		t.Errorf("what was used today is removed: %s", out)
	}
	succeed(t, "cache", "trim", "--down-to", "1kB", "--cache", store)
	if s := sizeOf(t, store); s.Records != 0 || s.Weighings != 2 {
		t.Errorf("trimmed to nothing: %+v", s)
	}
	if again, _ := succeed(t, "weigh", "--cache", store, first); again != before {
		t.Error("computed again it is not the same")
	}
}

// A store takes over what another has, once.
func TestCacheAbsorb(t *testing.T) {
	recipe, here, there := dunlin(t), t.TempDir(), t.TempDir()
	all := plural(len(weighed(t, "--cache", there, recipe).Nodes), "output")
	out, _ := succeed(t, "cache", "absorb", "--cache", here, there)
	if !strings.Contains(out, "took over "+all) || !strings.Contains(out, "1 weighing") {
		t.Errorf("%s", out)
	}
	if _, log := succeed(t, "weigh", "--cache", here, recipe); strings.Contains(log, "computed") || !strings.Contains(log, "nothing new since weighing 1") {
		t.Errorf("not all is there: %s", log)
	}
	if out, _ = succeed(t, "cache", "absorb", "--cache", here, there); !strings.Contains(out, "took over 0 outputs (0 B) and 0 weighings") {
		t.Errorf("the second time: %s", out)
	}
	if status, _, log := steelyard(t, "cache", "absorb", "--cache", here, here); status != exitFailed || !strings.Contains(log, "cannot absorb itself") {
		t.Errorf("itself: %d, %s", status, log)
	}
}

func checked(t *testing.T, want int, args ...string) (c storeCheck) {
	t.Helper()
	status, out, log := steelyard(t, append([]string{"cache", "check", "--json"}, args...)...)
	if status != want {
		t.Errorf("check %v: exit status %d, want %d: %s%s", args, status, want, out, log)
	}
	if err := json.Unmarshal([]byte(out), &c); err != nil {
		t.Fatalf("%v: %s", err, out)
	}
	return c
}

// Computing a sample again finds an output whose checksum is right and whose
// content is not what the node yields.
func TestCacheCheckRecomputes(t *testing.T) {
	recipe, store := dunlin(t), t.TempDir()
	all := len(weighed(t, "--cache", store, recipe).Nodes)
	if c := checked(t, exitDone, "--cache", store, "--recompute", "100", recipe); len(c.Recomputed) != all || c.Records != all || len(c.Problems) != 0 {
		t.Errorf("%+v", c)
	}
	if c := checked(t, exitDone, "--cache", store, "--recompute", "3", recipe); len(c.Recomputed) != 3 {
		t.Errorf("%+v", c)
	}
	s, err := cache.Open(store, cache.Options{})
	if err != nil {
		t.Fatal(err)
	}
	var record *cache.Record
	s.View(func(r *cache.Reader) error {
		record, _ = r.Past(cache.Name{Recipe: recipe, Node: "reconcile.tension"})
		return nil
	})
	s.Put(record, []byte(`{"forged": true}`))
	if err := s.Close(); err != nil {
		t.Fatal(err)
	}
	if c := checked(t, exitDone, "--cache", store); len(c.Problems) != 0 {
		t.Errorf("the checksums are right, and yet: %v", c.Problems)
	}
	c := checked(t, exitFailed, "--cache", store, "--recompute", "100", recipe)
	for _, r := range c.Recomputed {
		if forged := r.Node == "reconcile.tension"; r.Same == forged || forged != strings.Contains(r.Reason, "other bytes") {
			t.Errorf("%+v", r)
		}
	}
	status, out, log := steelyard(t, "cache", "check", "--cache", store, "--recompute", "100", recipe)
	if status != exitFailed || !strings.Contains(out, "computed reported.gas again: the same") || !strings.Contains(log, "1 problem in the store") {
		t.Errorf("%d: %s%s", status, out, log)
	}
}

// Recomputing a sample computes nothing else.
func TestCacheCheckComputesNothingNew(t *testing.T) {
	recipe, store := dunlin(t), t.TempDir()
	if status, _, log := steelyard(t, "cache", "check", "--cache", store, "--recompute", "1", recipe); status != exitFailed || !strings.Contains(log, "weigh them first") {
		t.Errorf("an empty store: %d, %s", status, log)
	}
	all := len(weighed(t, "--cache", store, recipe).Nodes)
	edit(t, recipe, "normal(0.0, 0.02)", "normal(0.0, 0.05)")
	out, _ := succeed(t, "inspect", "--cache", store, recipe)
	stored := strings.Count(out, " reused\n")
	if c := checked(t, exitDone, "--cache", store, "--recompute", "100", recipe); len(c.Recomputed) != stored || stored == 0 || stored == all {
		t.Errorf("%d of %d nodes are stored: %+v", stored, all, c)
	}
	if s := sizeOf(t, store); s.Records != all {
		t.Errorf("%d records, want the %d of the weighing", s.Records, all)
	}
}

// flip changes a byte in the middle of a text that a file holds.
func flip(t *testing.T, file, text string) {
	t.Helper()
	b, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	if !strings.Contains(string(b), text) {
		t.Fatalf("%s does not hold %q", file, text)
	}
	changed := strings.ReplaceAll(string(b), text, text[:len(text)/2]+"#"+text[len(text)/2+1:])
	if err := os.WriteFile(file, []byte(changed), 0o644); err != nil {
		t.Fatal(err)
	}
}

// Whatever happens to the store's files, the masses are those of an undisturbed
// run, the damage is said, and afterwards the store is sound.
func TestDamagedStore(t *testing.T) {
	recipe := dunlin(t)
	edit(t, recipe, "draws = 200", "draws = 900") // the draws of an estimate become a file of their own
	whole, _ := succeed(t, "weigh", "--cache", t.TempDir(), recipe)
	for name, c := range map[string]struct {
		damage func(store string)
		say    string
	}{
		"a byte of an output": {func(store string) { flip(t, filepath.Join(store, "store.db"), `"covers_kpc"`) }, "damaged"},
		"a byte of a record":  {func(store string) { flip(t, filepath.Join(store, "store.db"), "lensing/tangential-shear") }, "damaged"},
		"a file cut short": {func(store string) {
			files, err := filepath.Glob(filepath.Join(store, "outputs", "*", "*"))
			if err != nil || len(files) == 0 {
				t.Fatalf("no output is a file (%v)", err)
			}
			for _, f := range files {
				if err := os.Truncate(f, 1000); err != nil {
					t.Fatal(err)
				}
			}
		}, "missing"},
		"half the database": {func(store string) {
			if err := os.Truncate(filepath.Join(store, "store.db"), 20000); err != nil {
				t.Fatal(err)
			}
		}, "damaged"},
		"another file in its place": {func(store string) {
			if err := os.WriteFile(filepath.Join(store, "store.db"), []byte(strings.Repeat("no database ", 5000)), 0o644); err != nil {
				t.Fatal(err)
			}
		}, "damaged"},
	} {
		t.Run(name, func(t *testing.T) {
			store := t.TempDir()
			weighed(t, "--cache", store, recipe)
			c.damage(store)
			if status, out, _ := steelyard(t, "inspect", "--cache", store, recipe); status != exitDone || !strings.Contains(out, "nodes") {
				t.Errorf("inspect: exit status %d\n%s", status, out)
			}
			if found := checked(t, exitFailed, "--cache", store); len(found.Problems) == 0 {
				t.Error("check finds nothing")
			}
			again, log := succeed(t, "weigh", "--cache", store, recipe)
			if again != whole {
				t.Errorf("the masses are others:\n%s", again)
			}
			if !strings.Contains(log, "warning") || !strings.Contains(log, c.say) {
				t.Errorf("the damage is not said: %s", log)
			}
			if found := checked(t, exitDone, "--cache", store, "--repair"); len(found.Problems) > 0 {
				t.Errorf("afterwards: %v", found.Problems)
			}
		})
	}
}
