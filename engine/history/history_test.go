package history

import (
	"bytes"
	"context"
	"encoding/json"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"
	"unicode/utf8"

	"steelyard/cache"
	"steelyard/engine"
	"steelyard/engine/layout"
	"steelyard/engine/weighing"
)

// desk is a recipe that can be weighed without any astronomy.
type desk struct {
	t      *testing.T
	store  *cache.Store
	recipe string
	now    time.Time
	text   string // of the data file
	nodes  []engine.Node
	found  *weighing.Weighing
}

func newDesk(t *testing.T) *desk {
	t.Helper()
	dir := t.TempDir()
	store, err := cache.Open(filepath.Join(dir, "store"), cache.Options{})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { store.Close() })
	d := &desk{t: t, store: store, recipe: filepath.Join(dir, "project", "recipe.hcl"), now: at(t, "2026-03-30 09:00:00"), text: "1\n2\n"}
	data := filepath.Join(dir, "data", "shear.csv")
	for _, folder := range []string{filepath.Dir(d.recipe), filepath.Dir(data)} {
		if err := os.Mkdir(folder, 0o777); err != nil {
			t.Fatal(err)
		}
	}
	d.nodes = []engine.Node{
		{ID: "lensing.shear.profile.table", Kind: "table", Version: 1, Params: []string{`name = "shear.csv"`, `column.value = "g" unit "" as "" length false text false`}, Files: []string{data}},
		{ID: "lensing.shear.profile.reduced", Kind: "lensing/profile", Version: 1, Params: []string{"redshift = 0.2", "profile = present", "bins = present", "bins.count = exact(10, 0, 0)"}, Inputs: []string{"lensing.shear.profile.table"}},
		{ID: "lensing.shear.nfw", Kind: "lensing/tangential-shear", Version: 2, Params: []string{"redshift = 0.2", "seed = 7", "infer_version = 1", "bins = present", "bins.count = exact(10, 0, 0)", "estimate = present", "estimate.concentration = lognormal(4.5, 0.3, 0)"}, Inputs: []string{"lensing.shear.profile.reduced"}},
		{ID: "lensing.shear.nfw.masses", Kind: "masses", Version: 1, Params: []string{"redshift = 0.2", `own = 500 "critical"`}, Inputs: []string{"lensing.shear.nfw"}},
		{ID: "reconcile.matched", Kind: "reconcile/matched", Version: 1, Params: []string{"redshift = 0.2", "seed = 7", `at = 0 500 "critical"`}, Inputs: []string{"lensing.shear.nfw"}},
	}
	for i := range d.nodes {
		n := d.nodes[i]
		d.nodes[i].Run = func(_ context.Context, job engine.Job) (engine.Output, error) {
			var out []byte
			for _, path := range n.Files { // of which the lines count, but not those that are comments
				b, err := os.ReadFile(path)
				if err != nil {
					return engine.Output{}, err
				}
				for line := range strings.Lines(string(b)) {
					if !strings.HasPrefix(line, "#") {
						out = append(out, line...)
					}
				}
			}
			for _, id := range n.Inputs {
				b, err := job.Input(id)
				if err != nil {
					return engine.Output{}, err
				}
				out = append(out, b...)
			}
			return engine.Output{Bytes: fmt.Appendf(out, "%v", d.nodes[i].Params[1:]), Diagnostics: []string{"read " + n.ID}}, nil
		}
	}
	d.found = &weighing.Weighing{
		Schema: weighing.Schema, Object: weighing.Object{Name: "Dunlin", Redshift: 0.2},
		Estimates: []weighing.Estimate{{
			Name: "lensing.shear.nfw", Probe: "lensing", Method: "tangential-shear",
			Own: []weighing.Own{
				{Overdensity: 500, Of: "critical", Radius: weighing.Interval{Median: 1000, Lo: 900, Hi: 1100}, Mass: weighing.Interval{Median: 5e14, Lo: 4e14, Hi: 7e14}},
				{Overdensity: 200, Of: "critical", Radius: weighing.Interval{Median: 1500, Lo: 1400, Hi: 1600}, Mass: weighing.Interval{Median: 8e14, Lo: 7e14, Hi: 9e14}},
			},
			At: []weighing.At{{At: "overdensity 500", Radius: 1000, Mass: weighing.Interval{Median: 5e14, Lo: 4e14, Hi: 6e14}}},
		}},
		Tensions:    []weighing.Tension{{At: "overdensity 500", A: "lensing.shear.nfw", B: "reported.gas", Ratio: weighing.Interval{Median: 0.8, Lo: 0.7, Hi: 0.9}, Sigma: -2.1}},
		Consistency: []weighing.Consistency{{At: "overdensity 500", Sigma: 2.1, Verdict: "strained"}},
		Combined:    []weighing.Combined{{At: "overdensity 500", Mass: weighing.Interval{Median: 5e14, Lo: 4.5e14, Hi: 5.5e14}}},
	}
	return d
}

// set replaces a parameter of every node that has it.
func (d *desk) set(from, to string) {
	d.t.Helper()
	hit := false
	for i := range d.nodes {
		for k, p := range d.nodes[i].Params {
			if p == from {
				params := slices.Clone(d.nodes[i].Params)
				params[k] = to
				d.nodes[i].Params, hit = params, true
			}
		}
	}
	if !hit {
		d.t.Fatalf("no node has %q", from)
	}
}

// weigh runs the nodes and records the weighing, an hour later than the last.
func (d *desk) weigh() (cache.Weighing, bool) {
	d.t.Helper()
	if err := os.WriteFile(d.nodes[0].Files[0], []byte(d.text), 0o666); err != nil {
		d.t.Fatal(err)
	}
	g, err := engine.NewGraph(d.nodes)
	if err != nil {
		d.t.Fatal(err)
	}
	d.now = d.now.Add(time.Hour)
	clock := d.now.Add(-time.Hour)
	tick := func() time.Time { clock = clock.Add(10 * time.Minute); return clock }
	report, err := engine.Run(d.t.Context(), g, d.store, engine.Options{Recipe: d.recipe, Program: "v1", Workers: 1, Now: tick})
	if err == nil {
		err = report.Err()
	}
	if err != nil {
		d.t.Fatal(err)
	}
	d.found.Nodes = nil
	for _, r := range report.Results() {
		d.found.Nodes = append(d.found.Nodes, weighing.Node{ID: r.Node.ID, Kind: r.Node.Kind, State: string(r.State), Digest: r.Digest.String(), Seconds: r.Seconds})
	}
	w, fresh, err := Remember(d.store, d.recipe, "v1", d.now, d.found, report.Results())
	if err != nil {
		d.t.Fatal(err)
	}
	return w, fresh
}

func (d *desk) list() []cache.Weighing {
	d.t.Helper()
	list, err := List(d.store, d.recipe)
	if err != nil {
		d.t.Fatal(err)
	}
	return list
}

// compare compares the last two weighings.
func (d *desk) compare() *Comparison {
	d.t.Helper()
	list := d.list()
	last := len(list) - 1
	before, err := Read(d.store, list[last-1])
	if err != nil {
		d.t.Fatal(err)
	}
	now, err := Read(d.store, list[last])
	if err != nil {
		d.t.Fatal(err)
	}
	return Compare(before, now, MarkOf(list[last-1]), MarkOf(list[last]))
}

// A weighing that found the same is not recorded again, whatever its nodes cost;
// one that found the same from other data is.
func TestRememberOnce(t *testing.T) {
	d := newDesk(t)
	if w, fresh := d.weigh(); w.Number != 1 || !fresh {
		t.Errorf("first: %d, fresh %t", w.Number, fresh)
	}
	if w, fresh := d.weigh(); w.Number != 1 || fresh || !w.Finished.Equal(at(t, "2026-03-30 10:00:00")) {
		t.Errorf("again: %d of %v, fresh %t", w.Number, w.Finished, fresh)
	}
	plain := d.nodes
	trial := d.nodes[2]
	trial.ID += " with lensing.shear.nfw.concentration = 3"
	d.nodes = append(d.nodes[:len(d.nodes):len(d.nodes)], trial)
	d.found.Levers = []weighing.Lever{{At: "overdensity 500"}}
	if w, fresh := d.weigh(); w.Number != 1 || fresh {
		t.Errorf("asked for levers: %d, fresh %t", w.Number, fresh)
	}
	d.nodes = plain
	d.text = "# a comment\n" + d.text
	if w, fresh := d.weigh(); w.Number != 2 || !fresh {
		t.Errorf("with a comment in the data: %d, fresh %t", w.Number, fresh)
	}
	d.text = strings.TrimPrefix(d.text, "# a comment\n")
	if w, fresh := d.weigh(); w.Number != 3 || !fresh {
		t.Errorf("back to the first: %d, fresh %t", w.Number, fresh)
	}
	if n := len(d.list()); n != 3 {
		t.Errorf("%d weighings are listed", n)
	}
}

// What went in: data by content, assumptions by the names they have in the
// recipe, each said once, and nothing that merely follows from them.
func TestCompareInputs(t *testing.T) {
	d := newDesk(t)
	d.weigh()
	d.text = "1\n3\n"
	d.set("seed = 7", "seed = 8")
	d.set("bins.count = exact(10, 0, 0)", "bins.count = exact(8, 0, 0)")
	d.set("estimate.concentration = lognormal(4.5, 0.3, 0)", `estimate.concentration = exact(0, 0, 0) relation "duffy-2008"`)
	d.set("infer_version = 1", "infer_version = 2")
	d.set(`own = 500 "critical"`, `own = 1000 "critical"`)
	d.set(`at = 0 500 "critical"`, `at = 0 1000 "critical"`)
	d.set(`column.value = "g" unit "" as "" length false text false`, `column.value = "g_t" unit "" as "" length false text false`)
	d.nodes[2].Version = 3
	d.weigh()
	c := d.compare()
	if len(c.Files) != 1 || c.Files[0].Path != "../data/shear.csv" || c.Files[0].From == c.Files[0].To || !slices.Equal(c.Files[0].Of, []string{"lensing.shear.profile"}) {
		t.Errorf("files: %+v", c.Files)
	}
	want := []Change{
		{"lensing.shear.profile.value", "g", "g_t"},
		{"lensing.shear.bins.count", "10", "8"},
		{"seed", "7", "8"},
		{"lensing.shear.nfw.concentration", "lognormal(4.5, 0.3)", "relation duffy-2008"},
		{"reconcile.at", "overdensity 500", "overdensity 1000"},
	}
	if !slices.Equal(c.Assumptions, want) {
		t.Errorf("assumptions:\n%+v\nwant\n%+v", c.Assumptions, want)
	}
	if want := []Change{{"version of infer", "1", "2"}, {"version of lensing/tangential-shear", "2", "3"}}; !slices.Equal(c.Program, want) {
		t.Errorf("program: %+v", c.Program)
	}
	if c.Same() {
		t.Error("all this counts as the same")
	}
	// Another method: its own settings are not listed one by one.
	d.nodes[2].Kind = "lensing/aperture-mass"
	d.nodes[2].Params = append(d.nodes[2].Params[:5:5], "estimate = present", "estimate.filter = exact(0, 0, 0) text \"polynomial\"")
	d.weigh()
	if want := []Change{{"lensing.shear.nfw: method", "tangential-shear", "aperture-mass"}}; !slices.Equal(d.compare().Assumptions, want) {
		t.Errorf("another method: %+v", d.compare().Assumptions)
	}
}

// What came out, in units of the error on the side of the move; and it fits the
// screen.
func TestCompareResults(t *testing.T) {
	d := newDesk(t)
	d.weigh()
	second := *d.found
	second.Estimates = slices.Clone(d.found.Estimates)
	e := &second.Estimates[0]
	e.Own = slices.Clone(e.Own)
	e.Own[0].Mass.Median = 6e14    // half of 2e14 up
	e.Own[1].Mass.Median = 7.75e14 // a quarter of 1e14 down
	second.Estimates = append(second.Estimates, weighing.Estimate{Name: "dynamics.z.virial"})
	second.Tensions = slices.Clone(d.found.Tensions)
	second.Tensions[0].Ratio.Median, second.Tensions[0].Sigma = 0.9, -1.1
	second.Consistency = []weighing.Consistency{{At: "overdensity 500", Sigma: 1.1, Verdict: "consistent"}}
	second.Combined = []weighing.Combined{{At: "overdensity 500", Mass: weighing.Interval{Median: 5.2e14, Lo: 4.7e14, Hi: 5.7e14}}}
	second.Failures = []weighing.Failure{{Node: "xray.spectra.backward", Where: "recipe.hcl:9", Reason: "no"}}
	d.found = &second
	d.weigh()
	c := d.compare()
	if !c.Same() {
		t.Errorf("inputs are said to have changed: %+v", c)
	}
	moves := map[string]float64{"overdensity 500 true": 0.5, "overdensity 200 true": -0.25, "overdensity 500 false": 0}
	for _, m := range c.Masses {
		want, ok := moves[fmt.Sprintf("%s %t", m.Inside, m.Own)]
		// The division rounds once or twice.
		if !ok || m.Moved == nil || max(*m.Moved-want, want-*m.Moved) > 1e-12 {
			t.Errorf("%+v moved by %v, want %g", m, m.Moved, want)
		}
	}
	if len(c.Masses) != 3 || len(c.Tensions) != 1 || len(c.Consistency) != 1 {
		t.Fatalf("%d masses, %d tensions, %d places", len(c.Masses), len(c.Tensions), len(c.Consistency))
	}
	if x := c.Tensions[0]; max(*x.Moved-1, 1-*x.Moved) > 1e-12 || x.SigmaFrom != -2.1 || x.SigmaTo != -1.1 {
		t.Errorf("%+v", x)
	}
	if !slices.Equal(c.Appeared, []string{"dynamics.z.virial"}) || len(c.Gone) != 0 {
		t.Errorf("appeared %v, gone %v", c.Appeared, c.Gone)
	}
	var b bytes.Buffer
	if err := c.WriteText(&b, 1e14, time.UTC); err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{
		"Dunlin: weighing 2 of 2026-03-30 11:00 compared with 1 of 2026-03-30 10:00",
		"Nothing changed in data, assumptions or program.", "+0.5", "-0.2", "strained → CONSISTENT, 2.1σ → 1.1σ",
		"New estimates: dynamics.z.virial", "xray.spectra.backward (recipe.hcl:9): no", "-2.1 → -1.1",
		"at overdensity 500: combined mass 5.0 +0.5 -0.5 → 5.2 +0.5 -0.5, moved +0.4",
	} {
		if !strings.Contains(b.String(), want) {
			t.Errorf("the text does not have %q:\n%s", want, b.String())
		}
	}
	// The other way round the estimate is gone.
	from, _ := Read(d.store, d.list()[1])
	to, _ := Read(d.store, d.list()[0])
	if back := Compare(from, to, c.To, c.From); !slices.Equal(back.Gone, []string{"dynamics.z.virial"}) {
		t.Errorf("gone: %v", back.Gone)
	}
}

// An error of zero leaves nothing to measure a move by.
func TestMovedWithoutAnError(t *testing.T) {
	exact := weighing.Interval{Median: 1, Lo: 1, Hi: 1}
	if m := moved(exact, weighing.Interval{Median: 2}); m != nil {
		t.Errorf("moved by %g", *m)
	}
	if m := moved(exact, exact); m == nil || *m != 0 {
		t.Errorf("not moved by %v", m)
	}
}

// However much changed, it is one screen.
func TestOneScreen(t *testing.T) {
	c := &Comparison{Object: weighing.Object{Name: "Dunlin"}}
	for i := range 60 {
		c.Files = append(c.Files, FileChange{Path: fmt.Sprintf("a/rather/long/path/to/some/data/file/number/%d.fits", i), From: "a", To: "b", Of: []string{"lensing.shapes.galaxies"}})
		c.Assumptions = append(c.Assumptions, Change{fmt.Sprint("assumption", i), "1", "2"})
		moved := float64(i) / 10
		c.Tensions = append(c.Tensions, TensionMove{At: "overdensity 500", A: fmt.Sprint("lensing.shapes.estimate", i), B: "dynamics.redshifts.scaling", Moved: &moved, SigmaTo: moved})
	}
	var b bytes.Buffer
	if err := c.WriteText(&b, 1e14, time.UTC); err != nil {
		t.Fatal(err)
	}
	lines := strings.Split(strings.TrimSuffix(b.String(), "\n"), "\n")
	if len(lines) > 50 {
		t.Errorf("%d lines:\n%s", len(lines), b.String())
	}
	for _, line := range lines {
		if n := utf8.RuneCountInString(line); n > layout.Width {
			t.Errorf("%d columns: %s", n, line)
		}
	}
	for _, want := range []string{"and 51 more: --json lists them", "and 49 that moved less", "estimate59", "estimate50"} {
		if !strings.Contains(b.String(), want) {
			t.Errorf("%q is not said:\n%s", want, b.String())
		}
	}
}

// Entries that cannot be read say so.
func TestDamagedEntries(t *testing.T) {
	for body, want := range map[string]string{
		"":                     "JSON",
		`{"schema":"other/7"}`: `of the form "other/7", expected "steelyard/past/1"`,
		`{"schema":"steelyard/past/1","weighing":3}`: "cannot unmarshal",
	} {
		if _, err := decode([]byte(body)); err == nil || !strings.Contains(err.Error(), want) {
			t.Errorf("%q: %v, want %q", body, err, want)
		}
	}
	d := newDesk(t)
	w, _ := d.weigh()
	w.Body[0]++
	if _, err := Read(d.store, w); err == nil || !strings.Contains(err.Error(), "weighing 1 cannot be read") {
		t.Errorf("a body that is not there: %v", err)
	}
}

func FuzzDecode(f *testing.F) {
	f.Add([]byte(`{"schema":"steelyard/past/1","weighing":{"nodes":[{"id":"a","kind":"b"}]},"nodes":[{"id":"a","key":"version 1\nfile ab\ninput cd","files":["x"],"inputs":["a"]}]}`))
	f.Fuzz(func(t *testing.T, body []byte) {
		p, err := decode(body)
		if err != nil {
			return
		}
		Compare(p, p, Mark{}, Mark{})
		for _, n := range p.Nodes {
			p.above(&n)
			p.traced(&n, nil)
		}
		if _, err := json.Marshal(p.Nodes); err != nil {
			t.Error(err)
		}
	})
}
