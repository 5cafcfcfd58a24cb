package engine

import (
	"container/heap"
	"context"
	"errors"
	"fmt"
	"runtime"
	"sync"
	"time"

	"steelyard/cache"
)

// Options of a run; the zero value serves.
type Options struct {
	Recipe     string               // whose graph it is: the name under which the store remembers its nodes
	Workers    int                  // nodes computed at a time; 0 means as many as there are processors
	Program    string               // version of the program, for the records
	Arithmetic string               // enters every key; "" means Arithmetic()
	Now        func() time.Time     // clock for the records; nil means time.Now
	Events     func(Event)          // told what happens, one event at a time; nil means nobody is
	Verify     func(id string) bool // which reused nodes to compute again and compare; nil means none
	Grace      time.Duration        // after an interrupt, how long to wait for nodes to return; 0 means 0.5 s
}

func (o Options) filled() Options {
	if o.Workers <= 0 {
		o.Workers = runtime.GOMAXPROCS(0)
	}
	if o.Arithmetic == "" {
		o.Arithmetic = Arithmetic()
	}
	if o.Now == nil {
		o.Now = time.Now
	}
	if o.Events == nil {
		o.Events = func(Event) {}
	}
	if o.Grace == 0 {
		o.Grace = 500 * time.Millisecond
	}
	return o
}

// Outputs that wait to be committed are in memory; beyond these limits no
// further node is started until the disk has caught up.
const (
	maxUnstored      = 512
	maxUnstoredBytes = 64 << 20
)

// run is a graph being run. The loop alone changes steps and emits events;
// goroutines that compute or store tell it by messages.
type run struct {
	*plan
	ready    readyQueue
	messages chan message
	over     chan struct{} // closed when Run returns

	running  map[cache.Key][]int // keys being computed or stored -> other steps that wait for the same
	working  map[int]time.Time   // steps being computed, and since when
	storing  int                 // outputs being stored
	unstored int64               // their bytes

	decided int     // steps whose outcome is known
	idle    float64 // expected seconds of steps neither decided nor begun
	unknown int     // steps not decided whose expected time is not known

	mu     sync.Mutex
	notes  []string      // warnings
	healed map[int]*heal // steps whose stored outputs turned out to be lost
}

// message is what a goroutine tells the loop.
type message struct {
	step   int
	what   EventType // Progress; Finished: computed; stored; Warning
	done   float64
	record *cache.Record
	output []byte
	err    error
	text   string
}

// stored is a message: the output is in the store.
const stored EventType = "stored"

// Run computes what is missing of a graph and gives every node's outcome. A
// node that fails blocks those below it and no others. When ctx is cancelled no
// further node starts, nodes that return in time are kept like all finished
// before, and the error says so. Otherwise the error is nil, whatever became of
// the nodes, except for a store that a newer program wrote. There is always a
// report.
func Run(ctx context.Context, g *Graph, store *cache.Store, o Options) (*Report, error) {
	o = o.filled()
	p, err := newPlan(ctx, g, store, o)
	r := &run{
		plan:     p,
		messages: make(chan message),
		over:     make(chan struct{}),
		running:  map[cache.Key][]int{},
		working:  map[int]time.Time{},
		healed:   map[int]*heal{},
	}
	defer close(r.over)
	r.ready.steps = p.steps
	if err == nil {
		err = r.begin()
	}
	if err == nil {
		err = r.loop(ctx)
	}
	for i := range r.steps {
		if r.steps[i].state == "" {
			r.steps[i].state = Stopped
		}
	}
	store.Touch(p.stale)
	r.drainWarnings()
	return &Report{run: r}, err
}

// begin looks up what is stored and announces it.
func (r *run) begin() error {
	for i := range r.steps {
		if s := r.steps[i].state; s == Failed || s == Blocked {
			r.settle(i)
		}
	}
	missing, found, err := r.lookup(r.roots())
	if err != nil {
		return err
	}
	if len(missing) > 0 {
		if err := r.expect(); err != nil {
			return err
		}
	}
	for i := range r.steps {
		if s := &r.steps[i]; s.state == "" {
			s.pending = true
			r.idle += s.expected
			if s.expected == 0 {
				r.unknown++
			}
		}
	}
	r.sort(missing, found)
	r.emit(Event{Type: Planned})
	return nil
}

// sort sends looked-up steps on their way: the missing to the workers, the found
// to their end, unless they are to be verified.
func (r *run) sort(missing, found []int) {
	for _, i := range found {
		if r.o.Verify != nil && r.o.Verify(r.graph.nodes[i].ID) {
			missing = append(missing, i)
		} else {
			r.settle(i)
		}
	}
	for _, i := range missing {
		heap.Push(&r.ready, i)
	}
}

// loop starts nodes and takes messages until nothing is left to do.
func (r *run) loop(ctx context.Context) error {
	interrupt := ctx.Done()
	var deadline <-chan time.Time
	for {
		r.start(ctx)
		if len(r.working) == 0 && r.storing == 0 {
			break
		}
		select {
		case m := <-r.messages:
			if err := r.take(ctx, m); err != nil {
				return err
			}
		case <-interrupt:
			interrupt = nil
			deadline = time.After(r.o.Grace)
		case <-deadline:
			clear(r.working) // those that have not returned are left to themselves
		}
	}
	if r.decided == len(r.steps) {
		return nil
	}
	return interrupted(ctx)
}

func interrupted(ctx context.Context) error {
	return fmt.Errorf("interrupted; what was finished is kept: %w", context.Cause(ctx))
}

// start fills the free workers with ready nodes, the longest chain first.
func (r *run) start(ctx context.Context) {
	for len(r.working) < r.o.Workers && r.ready.Len() > 0 && ctx.Err() == nil {
		if r.storing >= maxUnstored || r.unstored >= maxUnstoredBytes {
			return
		}
		i := heap.Pop(&r.ready).(int)
		s, n := &r.steps[i], &r.graph.nodes[i]
		if others, busy := r.running[s.key]; busy {
			r.running[s.key] = append(others, i)
			continue
		}
		r.running[s.key] = nil
		r.working[i] = time.Now()
		if s.pending {
			r.idle -= s.expected
			s.begun = true
		}
		workers := r.o.Workers / min(r.o.Workers, len(r.working)+r.ready.Len())
		r.emit(Event{Type: Started, Node: n.ID, Kind: n.Kind, Expected: s.expected})
		go r.work(ctx, i, workers, s.state == Reused)
	}
}

// work computes a step, or verifies a reused one, and tells the loop, even
// should the node end its goroutine.
func (r *run) work(ctx context.Context, i, workers int, verify bool) {
	m := message{step: i, what: Finished, err: &NodeError{Node: &r.graph.nodes[i], Err: errors.New("it ended without a result")}}
	defer func() { r.tell(m) }()
	report := func(done float64) {
		select {
		case r.messages <- message{step: i, what: Progress, done: clampDone(done)}:
		default: // the loop is busy: the next report will do
		}
	}
	m.record, m.output, m.err = r.compute(ctx, i, workers, r.output, report)
	if verify && m.err == nil && cache.DigestOf(m.output) == r.steps[i].digest {
		if _, err := r.store.Output(r.steps[i].digest); err != nil {
			r.store.Put(m.record, m.output)
			r.tellWarning(fmt.Sprintf("the output of %s was stored again: %v", r.graph.nodes[i].ID, err))
		}
	}
}

// tell sends a message unless the run is over.
func (r *run) tell(m message) {
	select {
	case r.messages <- m:
	case <-r.over:
	}
}
