package history

import (
	"slices"
	"strings"
	"time"

	"steelyard/cache"
	"steelyard/engine/weighing"
)

// Trace is where one result of a weighing came from.
type Trace struct {
	Schema   string             `json:"schema"` // "steelyard/trace/1"
	Recipe   string             `json:"recipe"`
	Name     string             `json:"name"`
	Weighing Mark               `json:"weighing"`
	Stale    string             `json:"stale,omitempty"` // why the recipe would no longer give this
	Estimate *weighing.Estimate `json:"estimate,omitempty"`
	Nodes    []Traced           `json:"nodes"` // each after what it read
	Object   weighing.Object    `json:"-"`
	Unit     float64            `json:"-"` // of masses, Msun
}

// Traced is a node on the way to a result.
type Traced struct {
	ID         string         `json:"id"`
	Kind       string         `json:"kind"`
	Version    string         `json:"version"` // of the kind
	Key        string         `json:"key"`
	Parameters []Fact         `json:"parameters"`
	Inputs     []Source       `json:"inputs"`
	Files      []Source       `json:"files"`
	Output     string         `json:"output"`             // digest
	Computed   *Computed      `json:"computed,omitempty"` // absent when the store no longer knows
	Changed    *Recomputation `json:"changed,omitempty"`  // absent when it never was
}

// Source is something a node read, by name and digest.
type Source struct {
	Name   string `json:"name"`
	Digest string `json:"digest"`
}

// Computed is how a node's output came to be computed.
type Computed struct {
	Recipe      string    `json:"recipe"` // for which it was computed first
	Program     string    `json:"program"`
	Seconds     float64   `json:"seconds"`
	Finished    time.Time `json:"finished"`
	Bytes       int64     `json:"bytes"`
	Diagnostics []string  `json:"diagnostics"`
}

// Recomputation is which facts in a node's key were others in the weighing
// before the one it last changed in.
type Recomputation struct {
	In    Mark     `json:"in"`
	After Mark     `json:"after"` // the weighing before
	Facts []Change `json:"facts"`
}

// NameError is why a result cannot be traced.
type NameError struct {
	Name   string
	Failed *weighing.Failure // when it failed in this weighing
	Known  bool              // it is part of the weighing, but has no output
	Names  []string          // what can be traced
}

func (e *NameError) Error() string {
	switch {
	case e.Failed != nil:
		return e.Name + " failed in this weighing: " + e.Failed.Reason
	case e.Known:
		return e.Name + " was not computed in this weighing, for something above it failed"
	}
	return "there is no estimate and no node " + e.Name + " in this weighing"
}

// Follow traces a result of the weighing at a place of a list as List gives it: an
// estimate, a node or a data block. The error is a *NameError when there is no
// such thing.
func Follow(store *cache.Store, list []cache.Weighing, at int, name string) (*Trace, error) {
	p, err := Read(store, list[at])
	if err != nil {
		return nil, err
	}
	target, err := p.resolve(name)
	if err != nil {
		return nil, err
	}
	t := &Trace{
		Schema: "steelyard/trace/1", Recipe: list[at].Recipe, Name: name, Weighing: MarkOf(list[at]),
		Object: p.Weighing.Object, Unit: p.Weighing.MassUnit(),
	}
	if i := slices.IndexFunc(p.Weighing.Estimates, func(e weighing.Estimate) bool { return e.Name == name || e.Name+".masses" == name }); i >= 0 {
		t.Estimate = &p.Weighing.Estimates[i]
	}
	nodes := p.above(target)
	err = store.View(func(r *cache.Reader) error {
		for _, n := range nodes {
			record, _ := r.Record(cache.KeyOf(n.Key))
			t.Nodes = append(t.Nodes, p.traced(n, record))
		}
		return nil
	})
	if err != nil {
		return nil, err
	}
	return t, t.changes(store, list[:at+1], nodes)
}

// resolve finds the node that a name means. An estimate means the summary of its
// draws, for that is what is printed; a data block its reduction, or its table;
// reconcile the comparison.
func (p *Past) resolve(name string) (*Node, error) {
	for _, id := range []string{name + ".masses", name, name + ".reduced", name + ".table"} {
		if n := p.node(id); n != nil {
			return n, nil
		}
	}
	if name == "reconcile" { // the last comparison, for there may be several rounds
		for _, n := range slices.Backward(p.Nodes) {
			if n.Kind == "reconcile/tension" {
				return &n, nil
			}
		}
	}
	e := &NameError{Name: name}
	for i, f := range p.Weighing.Failures {
		if f.Node == name {
			e.Failed = &p.Weighing.Failures[i]
		}
	}
	for _, n := range p.Weighing.Nodes {
		e.Known = e.Known || n.ID == name
	}
	for _, n := range p.Nodes {
		e.Names = append(e.Names, strings.TrimSuffix(n.ID, ".masses"))
		if block, ok := strings.CutSuffix(n.ID, ".table"); ok {
			e.Names = append(e.Names, block)
		}
	}
	return nil, e
}

// above lists a node after everything it came from, each after what it read.
func (p *Past) above(target *Node) (nodes []*Node) {
	placed := map[string]bool{}
	var place func(n *Node)
	place = func(n *Node) {
		placed[n.ID] = true
		for _, id := range n.Inputs {
			if input := p.node(id); input != nil && !placed[id] {
				place(input)
			}
		}
		nodes = append(nodes, n)
	}
	place(target)
	return nodes
}

func (p *Past) traced(n *Node, record *cache.Record) Traced {
	t := Traced{
		ID: n.ID, Kind: n.Kind, Version: fact(n.Key, "version"), Key: cache.KeyOf(n.Key).String(),
		Parameters: parameters(n.Key), Inputs: reads(n.Inputs, n.digests("input")), Files: reads(n.Files, n.digests("file")), Output: n.Digest,
	}
	if record != nil {
		t.Computed = &Computed{
			Recipe: record.Name.Recipe, Program: record.Program, Seconds: record.Seconds, Finished: record.Finished,
			Bytes: record.Size, Diagnostics: append([]string{}, record.Diagnostics...),
		}
	}
	return t
}

func reads(names, digests []string) []Source {
	list := []Source{}
	for i := range min(len(names), len(digests)) {
		list = append(list, Source{names[i], digests[i]})
	}
	return list
}

// fact reads one fact of a key.
func fact(key, name string) string {
	for line := range strings.Lines(key) {
		if value, ok := strings.CutPrefix(strings.TrimSpace(line), name+" "); ok {
			return value
		}
	}
	return ""
}

// changes looks, for every node, for the last weighing that changed its key.
func (t *Trace) changes(store *cache.Store, list []cache.Weighing, nodes []*Node) error {
	open := map[int]bool{}
	for i := range nodes {
		open[i] = true
	}
	for at := len(list) - 2; at >= 0 && len(open) > 0; at-- {
		before, err := Read(store, list[at])
		if err != nil {
			return err
		}
		for i := range nodes {
			was := before.node(nodes[i].ID)
			if !open[i] || was == nil || was.Key == nodes[i].Key {
				continue
			}
			delete(open, i)
			r := &Recomputation{In: MarkOf(list[at+1]), After: MarkOf(list[at])}
			for _, x := range changes(was, nodes[i]) {
				from, to := readablePair(x.Fact, x.From, x.To)
				r.Facts = append(r.Facts, Change{x.Fact, from, to})
			}
			t.Nodes[i].Changed = r
		}
	}
	return nil
}
