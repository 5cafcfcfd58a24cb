package engine

import (
	"context"
	"errors"

	"steelyard/cache"
)

// Prospect is what would become of a node.
type Prospect struct {
	Node     *Node
	State    State        // Reused, ToCompute or Open; Failed or Blocked when a file cannot be read
	Digest   cache.Digest // of the output, when reused
	Expected float64      // seconds it should take, 0 when unknown
	Err      error        // when failed
	Because  []Change     // how its key differs from when it was last used
	Reason   string       // why it cannot be reused, when nothing changed in its key
}

// Inspect says what Run would do, and why, without computing or storing
// anything. A node below one to be computed is Open when it would be reused
// should those above it come out as they did last time.
func Inspect(ctx context.Context, g *Graph, store *cache.Store, o Options) ([]Prospect, error) {
	p, err := newPlan(ctx, g, store, o.filled())
	if err != nil {
		return nil, err
	}
	if _, _, err := p.lookup(p.roots()); err != nil {
		return nil, err
	}
	if err := p.expect(); err != nil {
		return nil, err
	}
	prospects := make([]Prospect, g.Len())
	err = store.View(func(r *cache.Reader) error {
		guesses := make([]*cache.Digest, g.Len()) // outputs as they are, or as they were
		for _, i := range g.order {
			prospects[i], guesses[i] = p.prospect(r, i, guesses)
		}
		return nil
	})
	return prospects, err
}

func (p *plan) prospect(r *cache.Reader, i int, guesses []*cache.Digest) (Prospect, *cache.Digest) {
	s := &p.steps[i]
	prospect := Prospect{Node: &p.graph.nodes[i], State: s.state, Expected: s.expected, Err: s.err, Reason: s.reason}
	if s.state == Reused {
		prospect.Digest = s.digest
		return prospect, &s.digest
	}
	if s.state != "" {
		return prospect, nil
	}
	prospect.State = ToCompute
	last, _ := r.Past(p.name(i))
	if last == nil {
		if prospect.Reason == "" {
			prospect.Reason = "it is not in the store"
		}
		return prospect, nil
	}
	inputs := make([]cache.Digest, len(p.graph.inputs[i]))
	for k, j := range p.graph.inputs[i] {
		if guesses[j] == nil {
			prospect.Reason = "what it reads is not in the store"
			return prospect, &last.Output
		}
		inputs[k] = *guesses[j]
	}
	now := &cache.Record{Transcript: p.transcript(i, inputs)}
	for k, j := range p.graph.inputs[i] {
		now.Inputs = append(now.Inputs, cache.Input{Node: p.graph.nodes[j].ID, Digest: inputs[k]})
	}
	for _, path := range p.graph.nodes[i].Files {
		now.Files = append(now.Files, cache.File{Path: path, Digest: p.files[path].Digest})
	}
	if record, _ := r.Record(now.Key()); record != nil && s.waiting > 0 {
		prospect.State = Open
		return prospect, &record.Output
	}
	prospect.Because = Changes(last, now)
	return prospect, &last.Output
}

// Explain compares the record that a node of a recipe used last with the one
// before it: which facts in its key changed.
func Explain(store *cache.Store, recipe, id string) (last, before *cache.Record, changes []Change, err error) {
	err = store.View(func(r *cache.Reader) error {
		last, before = r.Past(cache.Name{Recipe: recipe, Node: id})
		return nil
	})
	switch {
	case err != nil:
	case last == nil:
		err = errors.New("the store knows nothing of " + id + ": weigh the recipe first")
	case before != nil:
		changes = Changes(before, last)
	}
	return last, before, changes, err
}
