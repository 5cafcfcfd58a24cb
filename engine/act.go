package engine

import (
	"container/heap"
	"context"
	"errors"
	"fmt"

	"steelyard/cache"
)

// take acts on a message and on all that wait behind it, then looks up, in one
// transaction, what they made ready.
func (r *run) take(ctx context.Context, m message) error {
	var ready []int
	for more := true; more; {
		ready = append(ready, r.act(ctx, m)...)
		select {
		case m = <-r.messages:
		default:
			more = false
		}
	}
	r.drainWarnings()
	missing, found, err := r.lookup(ready)
	if err != nil {
		return err
	}
	r.sort(missing, found)
	return nil
}

// act acts on a message and gives the steps to look up.
func (r *run) act(ctx context.Context, m message) (ready []int) {
	s, n := &r.steps[m.step], &r.graph.nodes[m.step]
	switch m.what {
	case Warning:
		r.note(m.text)
	case Progress:
		if _, running := r.working[m.step]; !running { // a goroutine it left behind
			break
		}
		r.emit(Event{Type: Progress, Node: n.ID, Kind: n.Kind, Done: m.done, Expected: s.expected})
	case Finished:
		delete(r.working, m.step)
		switch {
		case m.err != nil:
			r.failed(ctx, m.step, m.err)
		case s.state == Reused:
			r.verified(m)
		default:
			r.keep(m)
		}
	case stored:
		r.storing--
		r.unstored -= m.record.Size
		s.state, s.digest, s.size, s.seconds = Computed, m.record.Output, m.record.Size, m.record.Seconds
		if s.reason != "" {
			r.note(fmt.Sprintf("%s was computed again: %s", n.ID, s.reason))
		}
		r.settle(m.step)
		ready = append(r.release(m.step), r.running[s.key]...) // and the same under other names
		delete(r.running, s.key)
	}
	return ready
}

// keep has a computed output stored.
func (r *run) keep(m message) {
	r.storing++
	r.unstored += int64(len(m.output))
	go func() {
		r.store.Put(m.record, m.output)
		r.tell(message{step: m.step, what: stored, record: m.record})
	}()
}

// verified compares what a reused node yields now with what is stored.
func (r *run) verified(m message) {
	s, n := &r.steps[m.step], &r.graph.nodes[m.step]
	r.free(m.step)
	if now := cache.DigestOf(m.output); now != s.digest {
		s.state = Failed
		s.err = &NodeError{Node: n, Err: fmt.Errorf("computed again it yields other bytes (%s) than are stored (%s): kind %q, version %d, cannot be relied on",
			now.Short(), s.digest.Short(), n.Kind, n.Version)}
	}
	s.verified = true
	r.settle(m.step)
}

// failed records a failure, unless the node only obeyed the interrupt.
func (r *run) failed(ctx context.Context, i int, err error) {
	r.free(i)
	if ctx.Err() != nil && (errors.Is(err, ctx.Err()) || errors.Is(err, context.Cause(ctx))) {
		return
	}
	for _, d := range r.fail(i, err) {
		r.settle(d)
	}
}

// free lets the steps that waited for the same key try for themselves.
func (r *run) free(i int) {
	key := r.steps[i].key
	for _, other := range r.running[key] {
		heap.Push(&r.ready, other)
	}
	delete(r.running, key)
}
