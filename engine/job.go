package engine

import (
	"context"
	"errors"
	"fmt"
	"math"
	"runtime/debug"
	"sync"
	"time"

	"steelyard/cache"
)

// NodeError is why a node failed.
type NodeError struct {
	Node  *Node
	Err   error
	Stack string // of a panic, for the developers
}

// Error is one line: where in the recipe, which node, what went wrong.
func (e *NodeError) Error() string {
	return fmt.Sprintf("%s%s: %v", at(e.Node.Where), e.Node.ID, e.Err)
}

func (e *NodeError) Unwrap() error { return e.Err }

// compute runs a step's node on its files as they were hashed. Should a file be
// touched meanwhile, its content left the same, the node runs again, for nobody
// can tell what it read.
func (p *plan) compute(ctx context.Context, i, workers int, input func(context.Context, int) ([]byte, error), report func(float64)) (*cache.Record, []byte, error) {
	n := &p.graph.nodes[i]
	fail := func(err error, stack string) error { return &NodeError{n, err, stack} }
	for range 3 {
		used := &usedFiles{plan: p, node: n, states: map[string]*cache.FileState{}}
		start := time.Now()
		out, stack, err := call(ctx, n, Job{
			Key:     p.steps[i].key,
			Workers: workers,
			Report:  report,
			File:    func(path string) (string, error) { return used.open(ctx, path) },
			Input: func(id string) ([]byte, error) {
				for k, j := range p.graph.inputs[i] {
					if n.Inputs[k] == id {
						return input(ctx, j)
					}
				}
				return nil, fmt.Errorf("node %q is not among the inputs of %q", id, n.ID)
			},
		})
		seconds := time.Since(start).Seconds()
		moved, changed := used.check(context.WithoutCancel(ctx))
		switch {
		case changed != nil:
			return nil, nil, fail(changed, "")
		case err != nil:
			return nil, nil, fail(err, stack)
		case !moved:
			return p.record(i, seconds, out), out.Bytes, nil
		}
	}
	return nil, nil, fail(errors.New("its input files are being written to: run again when that has finished"), "")
}

func (p *plan) record(i int, seconds float64, out Output) *cache.Record {
	n := &p.graph.nodes[i]
	r := &cache.Record{
		Name:        p.name(i),
		Kind:        n.Kind,
		Version:     n.Version,
		Transcript:  p.transcript(i, p.inputDigests(i)),
		Program:     p.o.Program,
		Seconds:     seconds,
		Diagnostics: out.Diagnostics,
		Finished:    p.o.Now().UTC(),
	}
	for k, j := range p.graph.inputs[i] {
		r.Inputs = append(r.Inputs, cache.Input{Node: n.Inputs[k], Digest: p.steps[j].digest})
	}
	for _, path := range n.Files {
		r.Files = append(r.Files, cache.File{Path: path, Digest: p.files[path].Digest})
	}
	return r
}

// call runs a node and turns a panic into an error.
func call(ctx context.Context, n *Node, job Job) (out Output, stack string, err error) {
	defer func() {
		if p := recover(); p != nil {
			err, stack = fmt.Errorf("it stopped on an internal error: %v", p), string(debug.Stack())
		}
	}()
	out, err = n.Run(ctx, job)
	return out, "", err
}

// usedFiles are the files a node asked for, as they were then.
type usedFiles struct {
	plan   *plan
	node   *Node
	mu     sync.Mutex
	states map[string]*cache.FileState
}

func (u *usedFiles) open(ctx context.Context, path string) (string, error) {
	u.mu.Lock()
	defer u.mu.Unlock()
	if u.states[path] != nil {
		return path, nil
	}
	for _, declared := range u.node.Files {
		if declared == path {
			state, err := u.plan.files[path].Again(ctx)
			if err != nil {
				return "", err
			}
			u.states[path] = state
			return path, nil
		}
	}
	return "", fmt.Errorf("%s is not among the files of %q", path, u.node.ID)
}

// check looks at the files after the node has read them: whether one was merely
// touched, and an error when one has other content.
func (u *usedFiles) check(ctx context.Context) (moved bool, err error) {
	u.mu.Lock()
	defer u.mu.Unlock()
	for _, path := range u.node.Files {
		before := u.states[path]
		if before == nil {
			continue
		}
		after, err := before.Again(ctx)
		if err != nil {
			return false, err
		}
		moved = moved || !before.Same(after)
	}
	return moved, nil
}

// clampDone keeps reported progress within 0 and 1.
func clampDone(done float64) float64 {
	if math.IsNaN(done) {
		return 0
	}
	return min(1, max(0, done))
}
