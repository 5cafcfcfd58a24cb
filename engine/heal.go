package engine

import (
	"context"
	"fmt"
	"sync"

	"steelyard/cache"
)

// heal is the repair of one output that was to be reused and turned out to be
// lost or damaged when somebody wanted to read it.
type heal struct {
	sync.Mutex
	reason string // once repaired
}

// output reads the output of a known step. One that is lost or damaged is
// computed again, by whoever comes first.
func (r *run) output(ctx context.Context, i int) ([]byte, error) {
	s, n := &r.steps[i], &r.graph.nodes[i]
	output, err := r.store.Output(s.digest)
	if err == nil {
		return output, nil
	}
	h := r.healOf(i)
	h.Lock()
	defer h.Unlock()
	if output, err = r.store.Output(s.digest); err == nil {
		return output, nil
	}
	record, output, again := r.compute(ctx, i, 1, r.output, func(float64) {})
	if again != nil {
		return nil, fmt.Errorf("the output of %s cannot be read (%v) and not be computed again: %w", n.ID, err, again)
	}
	if now := cache.DigestOf(output); now != s.digest {
		return nil, fmt.Errorf("the output of %s cannot be read (%v) and comes out different when computed again (%s instead of %s)",
			n.ID, err, now.Short(), s.digest.Short())
	}
	r.store.Put(record, output)
	h.reason = err.Error()
	r.tellWarning(fmt.Sprintf("the output of %s was computed again: %v", n.ID, err))
	return output, nil
}

func (r *run) healOf(i int) *heal {
	r.mu.Lock()
	defer r.mu.Unlock()
	if r.healed[i] == nil {
		r.healed[i] = &heal{}
	}
	return r.healed[i]
}

// repaired says why a step's output had to be computed again, "" when it had not.
func (r *run) repaired(i int) string {
	r.mu.Lock()
	h := r.healed[i]
	r.mu.Unlock()
	if h == nil {
		return ""
	}
	h.Lock()
	defer h.Unlock()
	return h.reason
}

// tellWarning has the loop announce a warning, or keeps it once the run is over.
func (r *run) tellWarning(text string) {
	select {
	case r.messages <- message{what: Warning, text: text}:
	case <-r.over:
		r.keepNote(text)
	}
}
