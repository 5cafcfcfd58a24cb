package assemble

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"os"
	"sort"
	"strings"
	"testing"

	"steelyard/cache"
	"steelyard/engine"
)

const (
	pinned = "testdata/pins.json"
	// write, set to anything, rewrites the pins from what the program puts out.
	write = "STEELYARD_PINS"
)

// pin is what a kind puts out for the recipes in testdata: the hash of all its
// outputs, in the order of their nodes.
type pin struct {
	Version int    `json:"version"`
	Output  string `json:"output"`
}

type pins struct {
	Arithmetic string         `json:"arithmetic"` // fingerprint of the machine that made the outputs
	Kinds      map[string]pin `json:"kinds"`
}

// A stored output is reused for ever under its kind's version, so an output may
// not change without the version: a wrong number would live on in every store.
// The digests hold on machines of the arithmetic they were made on; elsewhere
// only those of tables do, which are exact, and the versions.
func TestOutputsChangeOnlyWithTheirVersion(t *testing.T) {
	if testing.Short() {
		t.Skip("-short leaves out the pins: they take one fit by every method")
	}
	got := pins{engine.Arithmetic(), map[string]pin{}}
	for _, recipe := range []string{"testdata/pins.hcl"} {
		weighForPins(t, recipe, &got)
	}
	for _, p := range Probes() {
		for _, r := range p.Reductions {
			requirePin(t, got, p.Name+"/"+r.Name)
		}
		for _, m := range p.Methods {
			requirePin(t, got, p.Name+"/"+m.Name)
		}
	}
	if os.Getenv(write) != "" {
		b, err := json.MarshalIndent(got, "", "  ")
		if err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(pinned, append(b, '\n'), 0o644); err != nil {
			t.Fatal(err)
		}
		return
	}
	b, err := os.ReadFile(pinned)
	if err != nil {
		t.Fatalf("%v; make it with %s=1 go test ./engine/assemble", err, write)
	}
	var want pins
	if err := json.Unmarshal(b, &want); err != nil {
		t.Fatal(err)
	}
	for kind, g := range got.Kinds {
		w, ok := want.Kinds[kind]
		switch {
		case !ok:
			t.Errorf("%s is not pinned; run %s=1 go test ./engine/assemble", kind, write)
		case g.Version != w.Version:
			t.Errorf("%s has version %d, pinned is %d; run %s=1 go test ./engine/assemble", kind, g.Version, w.Version, write)
		case g.Output != w.Output && (got.Arithmetic == want.Arithmetic || kind == "table"):
			t.Errorf("%s puts out something else under the same version %d: raise its version, then run %s=1 go test ./engine/assemble", kind, g.Version, write)
		}
	}
	for kind := range want.Kinds {
		if _, ok := got.Kinds[kind]; !ok {
			t.Errorf("%s is pinned but no longer there", kind)
		}
	}
}

func requirePin(t *testing.T, p pins, kind string) {
	t.Helper()
	if _, ok := p.Kinds[kind]; !ok {
		t.Errorf("testdata/pins.hcl does not use %s", kind)
	}
}

// weighForPins weighs a recipe into a store of its own and hashes the outputs of
// each kind.
func weighForPins(t *testing.T, recipe string, into *pins) {
	t.Helper()
	r, diagnostics := Load(recipe)
	if diagnostics.HasErrors() {
		var b strings.Builder
		_ = diagnostics.Text(&b)
		t.Fatal(b.String())
	}
	plan, err := New(r)
	if err != nil {
		t.Fatal(err)
	}
	graph, err := engine.NewGraph(plan.Nodes)
	if err != nil {
		t.Fatal(err)
	}
	store, err := cache.Open(t.TempDir(), cache.Options{})
	if err != nil {
		t.Fatal(err)
	}
	defer store.Close()
	report, err := engine.Run(context.Background(), graph, store, engine.Options{Recipe: recipe})
	if err != nil {
		t.Fatal(err)
	}
	if err := report.Err(); err != nil {
		t.Fatal(err)
	}
	outputs := map[string][]string{}
	for _, result := range report.Results() {
		kind := result.Node.Kind
		outputs[kind] = append(outputs[kind], result.Node.ID+" "+result.Digest.String())
		into.Kinds[kind] = pin{Version: result.Node.Version}
	}
	for kind, list := range outputs {
		sort.Strings(list)
		sum := sha256.Sum256([]byte(strings.Join(list, "\n")))
		into.Kinds[kind] = pin{into.Kinds[kind].Version, hex.EncodeToString(sum[:])}
	}
}
