package engine

import (
	"bytes"
	"context"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"sync"
	"testing"

	"pgregory.net/rapid"

	"steelyard/cache"
)

// spec describes a node of a random graph. Its output is its parameter, inputs
// and files added up modulo a small number, so that different questions often
// have the same answer; large outputs repeat that number beyond 64 KiB.
type spec struct {
	id      string
	version int
	param   int
	modulus int
	large   bool
	inputs  []int // earlier specs
	files   []int
}

type world struct {
	dir   string
	specs []spec
	files []int // contents
	names int

	mu   sync.Mutex
	runs map[string]int // how often each question was computed, by the test's own idea of it
}

func (w *world) file(i int) string { return filepath.Join(w.dir, fmt.Sprint("file", i)) }

func (w *world) write(i, content int) {
	w.files[i] = content
	if err := os.WriteFile(w.file(i), fmt.Append(nil, content), 0o666); err != nil {
		panic(err)
	}
}

func answer(sum int, s *spec) []byte {
	out := fmt.Append(nil, sum%s.modulus)
	if s.large {
		return bytes.Repeat(append(out, ' '), 40000)
	}
	return out
}

func number(output []byte) (n int) {
	fmt.Sscan(string(output[:min(len(output), 20)]), &n)
	return n
}

// expected evaluates the specs directly: the outputs, and the questions.
func (w *world) expected() (outputs [][]byte, questions []string) {
	for i := range w.specs {
		s := &w.specs[i]
		sum, question := s.param, fmt.Sprint(s.version, s.param, s.modulus, s.large)
		for _, j := range s.inputs {
			sum += number(outputs[j])
			question += fmt.Sprint(" input ", number(outputs[j]), w.specs[j].large)
		}
		for _, f := range s.files {
			sum += w.files[f]
			question += fmt.Sprint(" file ", w.files[f])
		}
		outputs = append(outputs, answer(sum, s))
		questions = append(questions, question)
	}
	return outputs, questions
}

// graph is the specs as nodes, in a shuffled order. tally counts what runs.
func (w *world) graph(t *rapid.T, tally bool) *Graph {
	_, questions := w.expected()
	var nodes []Node
	for i := range w.specs {
		s := w.specs[i]
		n := Node{
			ID: s.id, Kind: "test/sum", Version: s.version,
			Params: []string{fmt.Sprint("param ", s.param), fmt.Sprint("modulus ", s.modulus), fmt.Sprint("large ", s.large)},
		}
		for _, j := range s.inputs {
			n.Inputs = append(n.Inputs, w.specs[j].id)
		}
		for _, f := range s.files {
			n.Files = append(n.Files, w.file(f))
		}
		n.Run = func(_ context.Context, job Job) (Output, error) {
			if tally {
				w.mu.Lock()
				w.runs[questions[i]]++
				w.mu.Unlock()
			}
			sum := s.param
			for _, id := range n.Inputs {
				b, err := job.Input(id)
				if err != nil {
					return Output{}, err
				}
				sum += number(b)
			}
			for _, f := range n.Files {
				path, err := job.File(f)
				if err != nil {
					return Output{}, err
				}
				b, err := os.ReadFile(path)
				if err != nil {
					return Output{}, err
				}
				sum += number(b)
			}
			return Output{Bytes: answer(sum, &s)}, nil
		}
		nodes = append(nodes, n)
	}
	g, err := NewGraph(rapid.Permutation(nodes).Draw(t, "order"))
	if err != nil {
		t.Fatal(err)
	}
	return g
}

func (w *world) addNode(t *rapid.T) {
	s := spec{
		id:      fmt.Sprint("node", w.names),
		version: 1,
		param:   rapid.IntRange(0, 3).Draw(t, "param"),
		modulus: rapid.IntRange(1, 4).Draw(t, "modulus"),
		large:   rapid.IntRange(0, 5).Draw(t, "large") == 0,
	}
	w.names++
	for j := range w.specs {
		if rapid.IntRange(0, 2).Draw(t, "edge") == 0 {
			s.inputs = append(s.inputs, j)
		}
	}
	for f := range w.files {
		if rapid.IntRange(0, 3).Draw(t, "reads") == 0 {
			s.files = append(s.files, f)
		}
	}
	w.specs = append(w.specs, s)
}

func (w *world) edit(t *rapid.T) {
	s := &w.specs[rapid.IntRange(0, len(w.specs)-1).Draw(t, "which")]
	switch rapid.IntRange(0, 8).Draw(t, "edit") {
	case 0:
		s.param = rapid.IntRange(0, 3).Draw(t, "param")
	case 1:
		s.version++
	case 2:
		w.names++
		s.id = fmt.Sprint("renamed", w.names)
	case 3:
		w.addNode(t)
	case 4: // the last node goes
		if len(w.specs) > 1 {
			w.specs = w.specs[:len(w.specs)-1]
		}
	case 5:
		if len(s.inputs) > 0 {
			s.inputs = slices.Delete(slices.Clone(s.inputs), 0, 1)
		}
	case 6, 7:
		w.write(rapid.IntRange(0, len(w.files)-1).Draw(t, "file"), rapid.IntRange(0, 3).Draw(t, "content"))
	case 8: // touched, its content left
		i := rapid.IntRange(0, len(w.files)-1).Draw(t, "file")
		w.write(i, w.files[i])
	}
}

// An incremental run equals a run from nothing, computes nothing twice and skips
// nothing that is needed, for any graph, any edits and any number of workers.
func TestIncrementalEqualsFromNothing(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		dir, err := os.MkdirTemp("", "steelyard-test")
		if err != nil {
			t.Fatal(err)
		}
		defer os.RemoveAll(dir)
		w := &world{dir: dir, files: make([]int, 3), runs: map[string]int{}}
		for i := range w.files {
			w.write(i, i)
		}
		for range rapid.IntRange(1, 8).Draw(t, "nodes") {
			w.addNode(t)
		}
		store := rapidStore(t, filepath.Join(dir, "kept"))
		defer store.Close()
		for edit := range rapid.IntRange(1, 5).Draw(t, "edits") {
			if edit > 0 {
				w.edit(t)
			}
			before := len(w.runs)
			wanted, questions := w.expected()
			fresh := map[string]bool{}
			for _, q := range questions {
				if w.runs[q] == 0 {
					fresh[q] = true
				}
			}
			workers := rapid.IntRange(1, 8).Draw(t, "workers")
			r := rapidRun(t, w.graph(t, true), store, workers)
			for q, times := range w.runs {
				if times != 1 {
					t.Fatalf("computed %d times: %s", times, q)
				}
			}
			if got := len(w.runs) - before; got != len(fresh) {
				t.Fatalf("computed %d questions, %d were new", got, len(fresh))
			}
			nothing := rapidStore(t, filepath.Join(dir, fmt.Sprint("nothing", edit)))
			again := rapidRun(t, w.graph(t, false), nothing, rapid.IntRange(1, 8).Draw(t, "other workers"))
			for i := range w.specs {
				id := w.specs[i].id
				out, err := r.Output(context.Background(), id)
				if err != nil || !bytes.Equal(out, wanted[i]) {
					t.Fatalf("%s is %.20q, %v; want %.20q", id, out, err, wanted[i])
				}
				if a, b := r.Result(id).Digest, again.Result(id).Digest; a != b {
					t.Fatalf("%s: incremental %s, from nothing %s", id, a, b)
				}
				if a, b := r.Result(id).Key, again.Result(id).Key; a != b {
					t.Fatalf("%s: keys differ: %s, %s", id, a, b)
				}
			}
			nothing.Close()
		}
	})
}

func rapidStore(t *rapid.T, dir string) *cache.Store {
	s, err := cache.Open(dir, cache.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func rapidRun(t *rapid.T, g *Graph, s *cache.Store, workers int) *Report {
	r, err := Run(context.Background(), g, s, Options{Recipe: "test", Workers: workers})
	if err != nil || r.Err() != nil || len(r.Warnings()) > 0 {
		t.Fatal(err, r.Err(), r.Warnings())
	}
	return r
}
