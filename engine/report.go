package engine

import (
	"context"
	"errors"
	"slices"

	"steelyard/cache"
)

// Report is what became of a graph. Outputs stay in the store until asked for.
type Report struct{ run *run }

// Result is what became of a node.
type Result struct {
	Node      *Node
	State     State
	Key       cache.Key
	Digest    cache.Digest // of the output, when reused or computed
	Size      int64        // of the output, bytes
	Seconds   float64      // computing took in this run, 0 when reused
	Verified  bool         // reused, computed again and found the same
	Err       error        // a *NodeError when failed
	BlockedBy string       // ID of the node that failed, when blocked
	Reason    string       // why a stored output could not be used, if one was there
}

// Results gives the outcome of every node in the order of the graph.
func (r *Report) Results() []Result {
	results := make([]Result, len(r.run.steps))
	for i := range results {
		results[i] = r.result(i)
	}
	return results
}

// Result gives the outcome of a node. It panics when the graph has no such node.
func (r *Report) Result(id string) Result { return r.result(r.place(id)) }

func (r *Report) place(id string) int {
	i, ok := r.run.graph.index[id]
	if !ok {
		panic("engine: no node " + id + " in the graph")
	}
	return i
}

func (r *Report) result(i int) Result {
	s := &r.run.steps[i]
	result := Result{
		Node: &r.run.graph.nodes[i], State: s.state, Key: s.key, Digest: s.digest, Size: s.size,
		Seconds: s.seconds, Verified: s.verified, Err: s.err, Reason: s.reason,
	}
	if s.state == Blocked {
		result.BlockedBy = r.run.graph.nodes[s.cause].ID
	}
	if reason := r.run.repaired(i); reason != "" {
		result.State, result.Reason = Computed, reason
	}
	return result
}

// Output reads the output of a node that was reused or computed. One that is
// damaged in the store is computed again.
func (r *Report) Output(ctx context.Context, id string) ([]byte, error) {
	i := r.place(id)
	if s := &r.run.steps[i]; !s.known() {
		if s.err != nil {
			return nil, s.err
		}
		return nil, errors.New("node " + id + " has no output: it is " + string(s.state))
	}
	return r.run.output(ctx, i)
}

// Record looks up how a node's output came about, nil when it has none or the
// store no longer knows.
func (r *Report) Record(id string) (record *cache.Record) {
	s := &r.run.steps[r.place(id)]
	if !s.known() {
		return nil
	}
	r.run.store.View(func(reader *cache.Reader) error {
		record, _ = reader.Record(s.key)
		return nil
	})
	return record
}

// Err joins the errors of the nodes that failed, in the order of the graph.
func (r *Report) Err() error {
	var errs []error
	for i := range r.run.steps {
		if err := r.run.steps[i].err; err != nil {
			errs = append(errs, err)
		}
	}
	return errors.Join(errs...)
}

// Count says how many nodes are in a state.
func (r *Report) Count(state State) (count int) {
	for i := range r.run.steps {
		if r.result(i).State == state {
			count++
		}
	}
	return count
}

// Warnings gives what went wrong with the store and was made good, so far:
// reading outputs may add to it.
func (r *Report) Warnings() []string {
	for _, w := range r.run.store.Warnings() {
		r.run.keepNote(w)
	}
	r.run.mu.Lock()
	defer r.run.mu.Unlock()
	return slices.Clone(r.run.notes)
}
