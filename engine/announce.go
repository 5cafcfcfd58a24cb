package engine

import "time"

// settle counts a step whose outcome is known and announces it.
func (r *run) settle(i int) {
	s, n := &r.steps[i], &r.graph.nodes[i]
	r.decided++
	if s.pending && !s.begun {
		r.idle -= s.expected
	}
	if s.pending && s.expected == 0 {
		r.unknown--
	}
	r.emit(Event{Type: Finished, Node: n.ID, Kind: n.Kind, State: s.state, Seconds: s.seconds, Err: s.err})
}

func (r *run) emit(e Event) {
	e.Finished, e.Total, e.Left = r.decided, len(r.steps), r.left()
	r.o.Events(e)
}

// left estimates how long the run still takes: the expected time shared among
// the workers, but no less than the longest running node still needs.
func (r *run) left() float64 {
	switch {
	case r.decided == len(r.steps):
		return 0
	case r.unknown > 0:
		return -1
	}
	sum, longest := r.idle, 0.0
	for i, since := range r.working {
		rest := max(0, r.steps[i].expected-time.Since(since).Seconds())
		sum += rest
		longest = max(longest, rest)
	}
	return max(longest, sum/float64(r.o.Workers))
}

// note keeps a warning and announces it. Only the loop may call it.
func (r *run) note(text string) {
	r.keepNote(text)
	r.emit(Event{Type: Warning, Text: text})
}

func (r *run) keepNote(text string) {
	r.mu.Lock()
	defer r.mu.Unlock()
	r.notes = append(r.notes, text)
}

func (r *run) drainWarnings() {
	for _, w := range r.store.Warnings() {
		r.note(w)
	}
}
