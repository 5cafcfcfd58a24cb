package history

import (
	"bytes"
	"encoding/json"
	"errors"
	"regexp"
	"slices"
	"strings"
	"testing"
	"time"

	"steelyard/cache"
	"steelyard/engine/weighing"
)

func (d *desk) follow(at int, name string) *Trace {
	d.t.Helper()
	t, err := Follow(d.store, d.list(), at, name)
	if err != nil {
		d.t.Fatal(err)
	}
	return t
}

func ids(t *Trace) (list []string) {
	for _, n := range t.Nodes {
		list = append(list, n.ID)
	}
	return list
}

// A trace has everything above a result and nothing else, each node after what it
// read, with what is known of it.
func TestFollow(t *testing.T) {
	d := newDesk(t)
	d.weigh()
	estimate := []string{"lensing.shear.profile.table", "lensing.shear.profile.reduced", "lensing.shear.nfw", "lensing.shear.nfw.masses"}
	for name, want := range map[string][]string{
		"lensing.shear.nfw":             estimate,
		"lensing.shear.nfw.masses":      estimate,
		"lensing.shear.profile":         estimate[:2],
		"lensing.shear.profile.table":   estimate[:1],
		"lensing.shear.profile.reduced": estimate[:2],
		"reconcile.matched":             append(estimate[:3:3], "reconcile.matched"),
	} {
		if got := ids(d.follow(0, name)); !slices.Equal(got, want) {
			t.Errorf("%s comes from %v, want %v", name, got, want)
		}
	}
	trace := d.follow(0, "lensing.shear.nfw")
	if trace.Estimate == nil || trace.Estimate.Name != "lensing.shear.nfw" || trace.Weighing.Number != 1 {
		t.Errorf("%+v", trace)
	}
	table, nfw := trace.Nodes[0], trace.Nodes[2]
	content := cache.DigestOf([]byte(d.text)).String()
	if !slices.Equal(table.Files, []Source{{"../data/shear.csv", content}}) || table.Output != trace.Nodes[1].Inputs[0].Digest {
		t.Errorf("%+v", table)
	}
	if c := nfw.Computed; c == nil || c.Program != "v1" || !c.Finished.Equal(at(t, "2026-03-30 09:30:00")) || !slices.Equal(c.Diagnostics, []string{"read lensing.shear.nfw"}) || c.Recipe != d.recipe || c.Bytes == 0 {
		t.Errorf("computed: %+v", c)
	}
	if nfw.Kind != "lensing/tangential-shear" || nfw.Version != "2" || nfw.Changed != nil ||
		!slices.Contains(nfw.Parameters, Fact{"estimate.concentration", "lognormal(4.5, 0.3)"}) || slices.Contains(nfw.Parameters, Fact{"bins", "present"}) {
		t.Errorf("%+v", nfw)
	}
}

// For a node that was computed again, the trace says which fact changed, from
// what to what, and in which weighing, however long ago.
func TestFollowSaysWhatChanged(t *testing.T) {
	d := newDesk(t)
	d.weigh()
	d.set("bins.count = exact(10, 0, 0)", "bins.count = exact(8, 0, 0)")
	d.weigh()
	d.set("estimate.concentration = lognormal(4.5, 0.3, 0)", "estimate.concentration = exact(4, 0, 0)")
	d.weigh()
	trace := d.follow(2, "lensing.shear.nfw")
	if c := trace.Nodes[0].Changed; c != nil {
		t.Errorf("the table changed: %+v", c)
	}
	if c := trace.Nodes[1].Changed; c == nil || c.In.Number != 2 || c.After.Number != 1 || !slices.Equal(c.Facts, []Change{{"bins.count", "10", "8"}}) {
		t.Errorf("reduced: %+v", c)
	}
	if c := trace.Nodes[2].Changed; c == nil || c.In.Number != 3 || !slices.Equal(c.Facts, []Change{{"estimate.concentration", "lognormal(4.5, 0.3)", "4"}}) {
		t.Errorf("nfw: %+v", c)
	}
	if c := trace.Nodes[3].Changed; c == nil || len(c.Facts) != 1 || c.Facts[0].Name != "output of lensing.shear.nfw" || c.Facts[0].To != short(trace.Nodes[2].Output) {
		t.Errorf("masses: %+v", c)
	}
	// The second weighing, seen from itself, does not know the third.
	if c := d.follow(1, "lensing.shear.nfw").Nodes[2].Changed; c == nil || c.In.Number != 2 || c.Facts[0].Name != "bins.count" {
		t.Errorf("nfw in the second weighing: %+v", c)
	}
	var b bytes.Buffer
	if err := trace.WriteText(&b, time.UTC); err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{
		"Dunlin, lensing.shear.nfw: weighing 3 of 2026-03-30 12:00", "M inside overdensity 500 = 5.0 +2.0 -1.0 1e14 Msun (R = 1000 +100 -100 kpc)",
		"file      ../data/shear.csv, sha256 " + trace.Nodes[0].Files[0].Digest, "changed   in weighing 2: bins.count: 10 → 8",
		"with      redshift = 0.2; seed = 7; infer_version = 1; bins.count = 8; concentration = 4", "says      read lensing.shear.nfw", "by steelyard v1",
	} {
		if !strings.Contains(b.String(), want) {
			t.Errorf("the text does not have %q:\n%s", want, b.String())
		}
	}
}

// What was trimmed away can still be traced to its files and parameters.
func TestFollowWhatWasTrimmed(t *testing.T) {
	d := newDesk(t)
	d.weigh()
	whole := d.follow(0, "lensing.shear.nfw")
	if _, err := d.store.Trim(cache.Trim{Before: time.Now().Add(time.Hour)}); err != nil {
		t.Fatal(err)
	}
	trimmed := d.follow(0, "lensing.shear.nfw")
	for i := range whole.Nodes {
		if trimmed.Nodes[i].Computed != nil {
			t.Fatal("the records are still there: this tests nothing")
		}
		whole.Nodes[i].Computed = nil
	}
	a, _ := json.Marshal(whole)
	b, _ := json.Marshal(trimmed)
	if string(a) != string(b) {
		t.Errorf("more is lost than when it was computed:\n%s\n%s", a, b)
	}
	var text bytes.Buffer
	if err := trimmed.WriteText(&text, time.UTC); err != nil || !strings.Contains(text.String(), "it was trimmed from the store") {
		t.Errorf("%v: %s", err, text.String())
	}
	checkProv(t, trimmed)
}

// Names that are not there, that failed, or that something above kept from being
// computed.
func TestFollowNames(t *testing.T) {
	d := newDesk(t)
	d.found.Failures = []weighing.Failure{{Node: "xray.spectra.backward", Reason: "row 4"}}
	d.weigh()
	for name, want := range map[string]string{
		"lensing.shear.nwf":     "there is no estimate and no node lensing.shear.nwf",
		"xray.spectra.backward": "failed in this weighing: row 4",
	} {
		_, err := Follow(d.store, d.list(), 0, name)
		var e *NameError
		if !errors.As(err, &e) || !strings.Contains(err.Error(), want) {
			t.Errorf("%s: %v", name, err)
		}
	}
	p, err := Read(d.store, d.list()[0])
	if err != nil {
		t.Fatal(err)
	}
	p.Nodes = p.Nodes[:1]
	_, err = p.resolve("lensing.shear.nfw")
	if err == nil || !strings.Contains(err.Error(), "something above it failed") {
		t.Errorf("blocked: %v", err)
	}
}

// qualified is a name of PROV: a declared prefix and a local part, of which the
// characters used here need no escape.
var qualified = regexp.MustCompile(`^([a-z]+):([A-Za-z0-9._-]*[A-Za-z0-9_-])$`)

// checkProv holds a document to the W3C Member Submission "The PROV-JSON
// Serialization" (Huynh et al. 2013): its sections, what each relation must have,
// and names with declared prefixes; and to "Constraints of the PROV Data Model"
// (W3C Recommendation 2013): everything referred to exists, nothing is generated
// twice, nor used before it was generated.
func checkProv(t *testing.T, trace *Trace) (document map[string]map[string]map[string]any) {
	t.Helper()
	b, err := json.Marshal(trace.Prov())
	if err != nil {
		t.Fatal(err)
	}
	var whole map[string]json.RawMessage
	if err := json.Unmarshal(b, &whole); err != nil {
		t.Fatal(err)
	}
	var prefixes map[string]string
	if err := json.Unmarshal(whole["prefix"], &prefixes); err != nil {
		t.Fatal(err)
	}
	prefixes["prov"], prefixes["xsd"] = "http://www.w3.org/ns/prov#", "http://www.w3.org/2000/10/XMLSchema#"
	delete(whole, "prefix")
	name := func(where, s string) {
		if m := qualified.FindStringSubmatch(s); m == nil || prefixes[m[1]] == "" {
			t.Errorf("%s: %q is not a qualified name with a declared prefix", where, s)
		}
	}
	document = map[string]map[string]map[string]any{}
	for section, text := range whole {
		var members map[string]map[string]any
		if err := json.Unmarshal(text, &members); err != nil {
			t.Fatalf("%s: %v", section, err)
		}
		document[section] = members
	}
	required := map[string][]string{
		"entity": nil, "activity": nil, "agent": nil,
		"used": {"prov:activity", "prov:entity"}, "wasGeneratedBy": {"prov:entity", "prov:activity"},
		"wasDerivedFrom": {"prov:generatedEntity", "prov:usedEntity"}, "wasAssociatedWith": {"prov:activity", "prov:agent"},
		"specializationOf": {"prov:specificEntity", "prov:generalEntity"},
	}
	refersTo := map[string]string{
		"prov:activity": "activity", "prov:agent": "agent", "prov:entity": "entity", "prov:generatedEntity": "entity",
		"prov:usedEntity": "entity", "prov:plan": "entity", "prov:specificEntity": "entity", "prov:generalEntity": "entity",
	}
	for section, members := range document {
		must, known := required[section]
		if !known {
			t.Errorf("the section %q is not of PROV-JSON, or not expected here", section)
		}
		for id, attributes := range members {
			if must == nil {
				name(section, id)
			} else if !strings.HasPrefix(id, "_:") {
				t.Errorf("%s %s has a name that nothing needs", section, id)
			}
			for _, m := range must {
				if attributes[m] == nil {
					t.Errorf("%s %s lacks %s", section, id, m)
				}
			}
			for key, value := range attributes {
				name(section+" "+id, key)
				if to := refersTo[key]; to != "" && document[to][value.(string)] == nil {
					t.Errorf("%s %s refers to %v, which is not there", section, id, value)
				}
				if typed, ok := value.(map[string]any); ok {
					name(section+" "+id, typed["$"].(string))
					name(section+" "+id, typed["type"].(string))
				}
				if strings.HasSuffix(key, "ime") { // prov:startTime, prov:endTime, prov:time
					if _, err := time.Parse(time.RFC3339Nano, value.(string)); err != nil {
						t.Errorf("%s %s: %v", section, id, err)
					}
				}
			}
		}
	}
	generated := map[string]string{}
	for _, g := range document["wasGeneratedBy"] {
		entity := g["prov:entity"].(string)
		if _, twice := generated[entity]; twice {
			t.Errorf("%s is generated twice", entity)
		}
		generated[entity], _ = g["prov:time"].(string)
	}
	for _, u := range document["used"] {
		start, _ := document["activity"][u["prov:activity"].(string)]["prov:startTime"].(string)
		made := generated[u["prov:entity"].(string)]
		a, errA := time.Parse(time.RFC3339Nano, made)
		b, errB := time.Parse(time.RFC3339Nano, start)
		if errA == nil && errB == nil && a.After(b) {
			t.Errorf("%v was generated at %s and used from %s", u["prov:entity"], made, start)
		}
	}
	return document
}

func TestProv(t *testing.T) {
	d := newDesk(t)
	d.weigh()
	document := checkProv(t, d.follow(0, "lensing.shear.nfw"))
	for section, want := range map[string]int{
		"activity": 4, "entity": 6 /* four outputs, a file, the recipe */, "agent": 1,
		"used": 4, "wasGeneratedBy": 4, "wasDerivedFrom": 4, "wasAssociatedWith": 4, "specializationOf": 0,
	} {
		if got := len(document[section]); got != want {
			t.Errorf("%d members of %s, want %d", got, section, want)
		}
	}
	file := document["entity"]["file:"+cache.DigestOf([]byte(d.text)).String()]
	if file["prov:location"] != "../data/shear.csv" {
		t.Errorf("the file: %v", file)
	}
}

// A table that was read again and came out the same is younger than what was
// computed from it: it is not said to have been used before it was there.
func TestProvKeepsTheOrderOfTime(t *testing.T) {
	d := newDesk(t)
	d.weigh()
	d.text = "# a comment\n" + d.text
	d.weigh()
	document := checkProv(t, d.follow(1, "lensing.shear.nfw"))
	if len(document["specializationOf"]) != 1 || len(document["used"]) != 4 {
		t.Errorf("%v", document["specializationOf"])
	}
}
