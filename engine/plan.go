package engine

import (
	"context"
	"fmt"
	"slices"

	"steelyard/cache"
)

// step is what is known of one node while a graph is planned and run.
type step struct {
	state   State        // "" while undecided
	key     cache.Key    // once all inputs are known
	digest  cache.Digest // of the output, once reused or computed
	size    int64
	reason  string // why a stored output could not be used
	err     error
	cause   int // of a blocked step: the step that failed
	waiting int // inputs not yet known

	pending  bool    // was not known when the run began
	begun    bool    // was given to a worker
	expected float64 // seconds, 0 when unknown
	chain    float64 // expected seconds of the longest chain from here down
	seconds  float64 // what computing took
	verified bool    // a reused output came out the same when computed again
}

// known says whether the step's output is.
func (s *step) known() bool { return s.state == Reused || s.state == Computed }

// plan is a graph on its way: what each node's key is and what is stored.
type plan struct {
	graph *Graph
	store *cache.Store
	o     Options
	steps []step
	files map[string]*cache.FileState
	stale []cache.Use // uses of records that the store should note
}

// newPlan reads the files of a graph. A node whose file cannot be read fails,
// with everything below it.
func newPlan(ctx context.Context, g *Graph, store *cache.Store, o Options) (*plan, error) {
	p := &plan{
		graph: g,
		store: store,
		o:     o,
		steps: make([]step, len(g.nodes)),
		files: map[string]*cache.FileState{},
	}
	for i := range p.steps {
		p.steps[i].waiting = len(g.inputs[i])
	}
	var paths []string
	for i := range g.nodes {
		for _, path := range g.nodes[i].Files {
			if _, ok := p.files[path]; !ok {
				p.files[path] = nil
				paths = append(paths, path)
			}
		}
	}
	states, errs := store.FileDigests(ctx, paths, o.Workers)
	if err := ctx.Err(); err != nil {
		return p, interrupted(ctx)
	}
	unread := map[string]error{}
	for i, path := range paths {
		p.files[path] = states[i]
		if errs[i] != nil {
			unread[path] = errs[i]
		}
	}
	for i := range g.nodes {
		for _, path := range g.nodes[i].Files {
			if err := unread[path]; err != nil && p.steps[i].state == "" {
				p.fail(i, &NodeError{Node: &g.nodes[i], Err: fmt.Errorf("cannot read its input: %w", err)})
			}
		}
	}
	return p, nil
}

// fail marks a step and blocks everything below it. It gives the steps decided.
func (p *plan) fail(i int, err error) (decided []int) {
	p.steps[i].state, p.steps[i].err = Failed, err
	decided = []int{i}
	for next := 0; next < len(decided); next++ {
		for _, d := range p.graph.dependents[decided[next]] {
			if p.steps[d].state == "" {
				p.steps[d].state, p.steps[d].cause = Blocked, i
				decided = append(decided, d)
			}
		}
	}
	return decided
}

// name is how the store knows a node.
func (p *plan) name(i int) cache.Name {
	return cache.Name{Recipe: p.o.Recipe, Node: p.graph.nodes[i].ID}
}

// transcript is the key transcript of a step whose inputs have these digests.
func (p *plan) transcript(i int, inputs []cache.Digest) string {
	n := &p.graph.nodes[i]
	files := make([]cache.Digest, len(n.Files))
	for k, path := range n.Files {
		files[k] = p.files[path].Digest
	}
	return transcript(n, p.o.Arithmetic, inputs, files)
}

func (p *plan) inputDigests(i int) []cache.Digest {
	digests := make([]cache.Digest, len(p.graph.inputs[i]))
	for k, j := range p.graph.inputs[i] {
		digests[k] = p.steps[j].digest
	}
	return digests
}

// lookup decides, in one transaction, every step among the candidates and below
// them that is stored. It gives those that are not and could start, and those
// found.
func (p *plan) lookup(candidates []int) (missing, found []int, err error) {
	if len(candidates) == 0 {
		return nil, nil, nil
	}
	queue := slices.Clone(candidates)
	err = p.store.View(func(r *cache.Reader) error {
		for next := 0; next < len(queue); next++ {
			i := queue[next]
			s := &p.steps[i]
			if s.state != "" {
				continue
			}
			s.key = cache.KeyOf(p.transcript(i, p.inputDigests(i)))
			record, reason := r.Record(s.key)
			if record == nil {
				s.reason = reason
				missing = append(missing, i)
				continue
			}
			s.state, s.digest, s.size = Reused, record.Output, record.Size
			found = append(found, i)
			if use := (cache.Use{Name: p.name(i), Key: s.key}); !r.Noted(use) {
				p.stale = append(p.stale, use)
			}
			queue = append(queue, p.release(i)...)
		}
		return nil
	})
	return missing, found, err
}

// release tells the steps below a known one, and gives those that now know all
// their inputs.
func (p *plan) release(i int) (ready []int) {
	for _, d := range p.graph.dependents[i] {
		s := &p.steps[d]
		for _, j := range p.graph.inputs[d] {
			if j == i {
				s.waiting--
			}
		}
		if s.waiting == 0 && s.state == "" {
			ready = append(ready, d)
		}
	}
	return ready
}

// roots are the undecided steps without inputs, in graph order.
func (p *plan) roots() (roots []int) {
	for i := range p.steps {
		if p.steps[i].waiting == 0 && p.steps[i].state == "" {
			roots = append(roots, i)
		}
	}
	return roots
}

// expect recalls how long undecided steps took before, and adds up the chains
// below them.
func (p *plan) expect() error {
	kinds := map[string]float64{}
	err := p.store.View(func(r *cache.Reader) error {
		for i := range p.steps {
			if p.steps[i].state != "" {
				continue
			}
			if last, _ := r.Past(p.name(i)); last != nil {
				p.steps[i].expected = last.Seconds
				continue
			}
			kind := p.graph.nodes[i].Kind
			seconds, ok := kinds[kind]
			if !ok {
				seconds = r.Seconds(kind)
				kinds[kind] = seconds
			}
			p.steps[i].expected = seconds
		}
		return nil
	})
	for _, i := range slices.Backward(p.graph.order) {
		s := &p.steps[i]
		s.chain = s.expected
		for _, d := range p.graph.dependents[i] {
			s.chain = max(s.chain, s.expected+p.steps[d].chain)
		}
	}
	return err
}
