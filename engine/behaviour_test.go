package engine

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"sync"
	"sync/atomic"
	"testing"
	"time"

	"steelyard/cache"
)

// work is a node that runs f.
func work(id string, inputs []string, f func(context.Context, Job) ([]byte, error)) Node {
	return Node{ID: id, Kind: "test/" + id, Inputs: inputs, Where: "recipe.hcl:7", Run: func(ctx context.Context, job Job) (Output, error) {
		b, err := f(ctx, job)
		return Output{Bytes: b}, err
	}}
}

func text(s string) func(context.Context, Job) ([]byte, error) {
	return func(context.Context, Job) ([]byte, error) { return []byte(s), nil }
}

func TestWhatFailsSaysWhere(t *testing.T) {
	dir := t.TempDir()
	s := openStore(t, dir)
	nodes := []Node{
		work("error", nil, func(context.Context, Job) ([]byte, error) { return nil, errors.New("the prior excludes the data") }),
		work("panic", nil, func(context.Context, Job) ([]byte, error) { panic("a bug") }),
		work("exit", nil, func(context.Context, Job) ([]byte, error) { runtime.Goexit(); return nil, nil }),
		work("input", nil, func(_ context.Context, job Job) ([]byte, error) { return job.Input("panic") }),
		work("file", nil, func(_ context.Context, job Job) ([]byte, error) { _, err := job.File("x.csv"); return nil, err }),
		work("missing", nil, text("never")),
		work("pause", nil, func(context.Context, Job) ([]byte, error) { return nil, context.DeadlineExceeded }),
		work("fine", nil, text("fine")),
		work("below", []string{"fine", "error"}, text("never")),
		work("further", []string{"below"}, text("never")),
	}
	nodes[5].Files = []string{filepath.Join(dir, "none.csv")}
	for range 2 { // failures are not stored: the second time is as the first
		r := mustRun(t, mustGraph(t, nodes...), s, Options{Workers: 2})
		for id, want := range map[string]string{
			"error":   "recipe.hcl:7: error: the prior excludes the data",
			"panic":   "recipe.hcl:7: panic: it stopped on an internal error: a bug",
			"exit":    "recipe.hcl:7: exit: it ended without a result",
			"input":   `recipe.hcl:7: input: node "panic" is not among the inputs of "input"`,
			"file":    `recipe.hcl:7: file: x.csv is not among the files of "file"`,
			"missing": "recipe.hcl:7: missing: cannot read its input: stat " + nodes[5].Files[0] + ": no such file or directory",
			"pause":   "recipe.hcl:7: pause: context deadline exceeded",
		} {
			result := r.Result(id)
			if result.State != Failed || result.Err == nil || result.Err.Error() != want {
				t.Errorf("%s is %s: %v", id, result.State, result.Err)
			}
			var node *NodeError
			if !errors.As(result.Err, &node) || node.Node.ID != id {
				t.Errorf("%s: %#v", id, result.Err)
			} else if (node.Stack != "") != (id == "panic") {
				t.Errorf("%s: stack %q", id, node.Stack)
			}
			if _, err := r.Output(t.Context(), id); err == nil || err.Error() != want {
				t.Errorf("output of %s: %v", id, err)
			}
		}
		for _, id := range []string{"below", "further"} {
			if result := r.Result(id); result.State != Blocked || result.BlockedBy != "error" {
				t.Errorf("%s: %+v", id, result)
			}
		}
		if r.Count(Failed) != 7 || r.Count(Blocked) != 2 || !r.Result("fine").known() {
			t.Error(states(r))
		}
		if lines := strings.Split(r.Err().Error(), "\n"); len(lines) != 7 || !strings.Contains(lines[6], "pause") {
			t.Errorf("errors: %v", r.Err())
		}
	}
}

func (r Result) known() bool { return r.State == Reused || r.State == Computed }

// The file a node parses is the file that was hashed, or the node fails.
func TestFileEditedDuringTheRun(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "data.csv")
	for _, c := range []struct {
		name         string
		before, late func()
		runs         int32
		want         string
	}{
		{"left alone", func() {}, func() {}, 1, ""},
		{"edited before it was opened", func() { os.WriteFile(path, []byte("twoo"), 0o666) }, func() {}, 1, "has changed since this run began: run again"},
		{"edited while it was read", func() {}, func() { os.WriteFile(path, []byte("twoo"), 0o666) }, 1, "has changed since this run began: run again"},
		{"touched before it was opened", func() { os.WriteFile(path, []byte("once"), 0o666) }, func() {}, 1, ""},
		{"removed", func() {}, func() { os.Remove(path) }, 1, "no such file"},
	} {
		s := openStore(t, filepath.Join(dir, c.name))
		os.WriteFile(path, []byte("once"), 0o666)
		var runs atomic.Int32
		n := work("a", nil, func(_ context.Context, job Job) ([]byte, error) {
			runs.Add(1)
			c.before()
			name, err := job.File(path)
			if err != nil {
				return nil, err
			}
			b, err := os.ReadFile(name)
			time.Sleep(15 * time.Millisecond) // coarser than the clock of file systems
			c.late()
			return b, err
		})
		n.Files = []string{path}
		r := mustRun(t, mustGraph(t, n), s, Options{})
		err := r.Err()
		if c.want == "" && err != nil || c.want != "" && (err == nil || !strings.Contains(err.Error(), c.want)) || runs.Load() != c.runs {
			t.Errorf("%s: ran %d times, %v", c.name, runs.Load(), err)
		}
		if c.want != "" {
			os.WriteFile(path, []byte("once"), 0o666)
			prospects, err := Inspect(t.Context(), mustGraph(t, n), s, Options{})
			if err != nil || prospects[0].State != ToCompute {
				t.Errorf("%s: something was stored: %+v, %v", c.name, prospects, err)
			}
		}
	}
}

// A file that is written to all the time, its content staying the same, cannot
// be trusted either.
func TestFileTouchedDuringTheRun(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "data.csv")
	s := openStore(t, filepath.Join(dir, "store"))
	for times, want := range map[int32]string{1: "", 9: "its input files are being written to"} {
		os.WriteFile(path, []byte("once"), 0o666)
		var runs atomic.Int32
		n := work(fmt.Sprint("touched", times), nil, func(_ context.Context, job Job) ([]byte, error) {
			name, err := job.File(path)
			if err != nil {
				return nil, err
			}
			time.Sleep(15 * time.Millisecond) // coarser than the clock of file systems
			if runs.Add(1) <= times {
				os.WriteFile(path, []byte("once"), 0o666)
			}
			return os.ReadFile(name)
		})
		n.Files = []string{path}
		err := mustRun(t, mustGraph(t, n), s, Options{}).Err()
		if (err == nil) != (want == "") || err != nil && !strings.Contains(err.Error(), want) {
			t.Errorf("touched %d times, ran %d times: %v", times, runs.Load(), err)
		}
	}
}

// An interrupt keeps what is finished, waits a little for what runs, and starts
// nothing more.
func TestInterrupt(t *testing.T) {
	s := openStore(t, t.TempDir())
	ctx, cancel := context.WithCancelCause(context.Background())
	deaf := make(chan struct{})
	defer close(deaf)
	var started sync.WaitGroup
	started.Add(3)
	nodes := []Node{
		work("first", nil, text("first")),
		work("deaf", []string{"first"}, func(context.Context, Job) ([]byte, error) { started.Done(); <-deaf; return []byte("too late"), nil }),
		work("obedient", []string{"first"}, func(ctx context.Context, _ Job) ([]byte, error) {
			started.Done()
			<-ctx.Done()
			return nil, fmt.Errorf("sampling: %w", ctx.Err())
		}),
		work("quick", []string{"first"}, func(ctx context.Context, _ Job) ([]byte, error) {
			started.Done()
			<-ctx.Done()
			return []byte("finished all the same"), nil
		}),
		work("below", []string{"quick"}, text("never")),
	}
	go func() {
		started.Wait()
		cancel(errors.New("interrupted by the user"))
	}()
	begin := time.Now()
	r, err := Run(ctx, mustGraph(t, nodes...), s, Options{Workers: 3, Grace: 200 * time.Millisecond})
	// Beyond the grace, committing takes what the disk takes.
	if took := time.Since(begin); took < 200*time.Millisecond || took > 5*time.Second {
		t.Errorf("took %v", took)
	}
	if err == nil || err.Error() != "interrupted; what was finished is kept: interrupted by the user" {
		t.Errorf("error %v", err)
	}
	wantStates(t, r, "first computed\ndeaf stopped\nobedient stopped\nquick computed\nbelow stopped")
	if r.Err() != nil {
		t.Error(r.Err())
	}
	nodes[1] = work("deaf", []string{"first"}, text("in time"))
	nodes[2] = work("obedient", []string{"first"}, text("done"))
	wantStates(t, mustRun(t, mustGraph(t, nodes...), s, Options{}), "first reused\ndeaf computed\nobedient computed\nquick reused\nbelow computed")
}

func TestInterruptedBeforeItBegan(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	r, err := Run(ctx, mustGraph(t, work("a", nil, text("a"))), openStore(t, t.TempDir()), Options{})
	if !errors.Is(err, context.Canceled) {
		t.Error(err)
	}
	wantStates(t, r, "a stopped")
}

// A run in which everything is reused is done even when interrupted.
func TestInterruptAfterTheEnd(t *testing.T) {
	s := openStore(t, t.TempDir())
	ctx, cancel := context.WithCancel(context.Background())
	g := mustGraph(t, work("a", nil, func(context.Context, Job) ([]byte, error) { cancel(); return []byte("a"), nil }))
	r, err := Run(ctx, g, s, Options{})
	if err != nil {
		t.Error(err)
	}
	wantStates(t, r, "a computed")
}

func TestEvents(t *testing.T) {
	s := openStore(t, t.TempDir())
	var events []Event
	var busy atomic.Bool
	o := Options{Recipe: "r", Workers: 4, Events: func(e Event) {
		if !busy.CompareAndSwap(false, true) {
			t.Error("two events at once")
		}
		events = append(events, e)
		busy.Store(false)
	}}
	slow := func(ctx context.Context, job Job) ([]byte, error) {
		job.Report(-3)
		for i := range 20 {
			job.Report(float64(i) / 20)
			time.Sleep(2 * time.Millisecond)
		}
		return []byte("slow"), nil
	}
	g := mustGraph(t, work("old", nil, text("old")), work("slow", []string{"old"}, slow), work("bad", []string{"old"}, func(context.Context, Job) ([]byte, error) { return nil, errors.New("bad") }), work("below", []string{"bad"}, text("")))
	mustRun(t, mustGraph(t, work("old", nil, text("old"))), s, Options{Recipe: "r"})
	mustRun(t, g, s, o)
	var lines []string
	progress := 0
	for _, e := range events {
		if e.Type == Progress {
			if progress++; e.Node != "slow" || e.Done < 0 || e.Done > 1 {
				t.Errorf("%+v", e)
			}
			continue
		}
		if e.Total != 4 {
			t.Errorf("%+v", e)
		}
		lines = append(lines, fmt.Sprintf("%s %s %s %d %v", e.Type, e.Node, e.State, e.Finished, e.Err))
	}
	// bad and slow start in either order, for neither was computed before.
	got := strings.Join(lines, "\n")
	for _, want := range []string{
		"finished old reused 1 <nil>\nplanned   1 <nil>\nstarted ",
		"finished bad failed 2 recipe.hcl:7: bad: bad\nfinished below blocked 3 <nil>",
		"finished slow computed 4 <nil>",
	} {
		if !strings.Contains(got, want) {
			t.Errorf("events\n%s\nlack\n%s", got, want)
		}
	}
	if progress == 0 {
		t.Error("no progress was reported")
	}
	if events[1].Left != -1 {
		t.Errorf("left %v before anything was ever computed", events[1].Left)
	}
}

// The second time, how long nodes take is known: the longest chain starts
// first, and how long is left goes down to nothing.
func TestLongestChainFirst(t *testing.T) {
	s := openStore(t, t.TempDir())
	graph := func(round string) *Graph {
		take := func(id string, d time.Duration, inputs ...string) Node {
			n := work(id, inputs, func(context.Context, Job) ([]byte, error) { time.Sleep(d); return []byte(id), nil })
			n.Params = []string{round}
			return n
		}
		return mustGraph(t, take("short", time.Millisecond), take("medium", 40*time.Millisecond), take("head", 10*time.Millisecond), take("tail", 80*time.Millisecond, "head"))
	}
	mustRun(t, graph("one"), s, Options{Recipe: "r"})
	var order []string
	var left []float64
	mustRun(t, graph("two"), s, Options{Recipe: "r", Workers: 1, Events: func(e Event) {
		if e.Type == Started {
			order = append(order, e.Node)
		}
		left = append(left, e.Left)
	}})
	// While head is being stored, the free worker takes the next best.
	const want = "head medium tail short"
	if got := strings.Join(order, " "); got != want {
		t.Errorf("order %s", got)
	}
	if left[0] < 0.12 || left[len(left)-1] != 0 {
		t.Errorf("left %v", left)
	}
	// The same for another recipe, which knows its kinds only.
	order = nil
	mustRun(t, graph("three"), s, Options{Recipe: "other", Workers: 1, Events: func(e Event) {
		if e.Type == Started {
			order = append(order, e.Node)
		}
	}})
	if got := strings.Join(order, " "); got != want {
		t.Errorf("order %s", got)
	}
}

// Workers are shared among the nodes that could run.
func TestWorkersAreShared(t *testing.T) {
	s := openStore(t, t.TempDir())
	var mu sync.Mutex
	given := map[string]int{}
	share := func(id string, inputs ...string) Node {
		return work(id, inputs, func(_ context.Context, job Job) ([]byte, error) {
			mu.Lock()
			defer mu.Unlock()
			given[id] = job.Workers
			return nil, nil
		})
	}
	mustRun(t, mustGraph(t, share("a"), share("b", "a"), share("c", "a"), share("d", "a"), share("e", "b", "c", "d")), s, Options{Workers: 6})
	if got := fmt.Sprint(given); got != "map[a:6 b:2 c:2 d:2 e:6]" {
		t.Error(got)
	}
}

// Two nodes that ask the same question are computed once, at the same time or
// not, even should the first to try fail.
func TestSameQuestionIsComputedOnce(t *testing.T) {
	s := openStore(t, t.TempDir())
	var runs atomic.Int32
	same := func(id string) Node {
		n := work(id, nil, func(context.Context, Job) ([]byte, error) {
			if runs.Add(1) == 1 {
				time.Sleep(20 * time.Millisecond)
				return nil, errors.New("bad luck")
			}
			time.Sleep(20 * time.Millisecond)
			return []byte("answer"), nil
		})
		n.Kind = "test/same"
		return n
	}
	r := mustRun(t, mustGraph(t, same("a"), same("b"), same("c"), same("d")), s, Options{Workers: 4})
	if r.Count(Failed) != 1 || r.Count(Computed) != 1 || r.Count(Reused) != 2 || runs.Load() != 2 {
		t.Errorf("ran %d times\n%s", runs.Load(), states(r))
	}
}

func TestVerify(t *testing.T) {
	dir := t.TempDir()
	s := openStore(t, dir)
	var runs atomic.Int32
	counting := work("counting", []string{"steady"}, func(context.Context, Job) ([]byte, error) {
		return fmt.Append(nil, "run ", runs.Add(1)), nil
	})
	g := mustGraph(t, work("steady", nil, text("a steady output")), counting, work("below", []string{"counting"}, text("below")))
	mustRun(t, g, s, Options{})
	r := mustRun(t, g, s, Options{Verify: func(string) bool { return true }})
	wantStates(t, r, "steady reused\ncounting failed\nbelow reused")
	if !r.Result("steady").Verified || !r.Result("below").Verified || !strings.Contains(r.Err().Error(), "recipe.hcl:7: counting: computed again it yields other bytes") {
		t.Error(r.Err())
	}
	r = mustRun(t, g, s, Options{Verify: func(id string) bool { return id == "steady" }})
	if !r.Result("steady").Verified || r.Result("counting").Verified || r.Err() != nil {
		t.Error(states(r))
	}
	s.Close()
	spoilOutputs(t, dir, "a steady output")
	s = openStore(t, dir)
	r = mustRun(t, g, s, Options{Verify: func(id string) bool { return id == "steady" }})
	if w := strings.Join(r.Warnings(), "\n"); !r.Result("steady").Verified || !strings.Contains(w, "the output of steady was stored again: its stored bytes are damaged") {
		t.Error(states(r), w)
	}
	if out, err := r.Output(t.Context(), "steady"); string(out) != "a steady output" || err != nil {
		t.Errorf("%q, %v", out, err)
	}
}

// spoilOutputs damages every stored output.
func spoilOutputs(t *testing.T, dir string, outputs ...string) {
	t.Helper()
	path := filepath.Join(dir, "store.db")
	b, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	for _, o := range outputs {
		d := cache.DigestOf([]byte(o))
		file := filepath.Join(dir, "outputs", d.String()[:2], d.String())
		if _, err := os.Stat(file); err == nil {
			os.WriteFile(file, append([]byte("x"), o[1:]...), 0o666)
			continue
		}
		if !bytes.Contains(b, []byte(o)) {
			t.Fatalf("%q is not stored", o)
		}
		b = bytes.ReplaceAll(b, []byte(o), append([]byte{o[0] ^ 1}, o[1:]...)) // older pages hold copies
	}
	os.WriteFile(path, b, 0o666)
}

// Damage that shows only when an output is read, by a node or by whoever wants
// the result, is repaired then and there, and said.
func TestDamagedOutputsAreComputedAgain(t *testing.T) {
	large := strings.Repeat("large ", 20000)
	graph := func(param string) *Graph {
		top := work("top", []string{"a", "b"}, func(_ context.Context, job Job) ([]byte, error) {
			a, err := job.Input("a")
			if err != nil {
				return nil, err
			}
			b, err := job.Input("b")
			return append(a[:6:6], b[:6]...), err
		})
		top.Params = []string{param}
		return mustGraph(t, work("root", nil, text("the root's output")), work("a", []string{"root"}, func(_ context.Context, job Job) ([]byte, error) {
			_, err := job.Input("root")
			return []byte("small output"), err
		}), work("b", nil, text(large)), top)
	}
	for _, param := range []string{"same", "other"} {
		t.Run(param, func(t *testing.T) {
			dir := t.TempDir()
			mustRun(t, graph("same"), openStore(t, dir), Options{Workers: 1})
			spoilOutputs(t, dir, "the root's output", "small output", large)
			s := openStore(t, dir)
			r := mustRun(t, graph(param), s, Options{Workers: 2})
			if param == "same" {
				wantStates(t, r, "root reused\na reused\nb reused\ntop reused")
			}
			for id, want := range map[string]string{"top": "small large ", "a": "small output", "b": large} {
				if out, err := r.Output(t.Context(), id); err != nil || string(out) != want {
					t.Errorf("%s: %.20q, %v", id, out, err)
				}
			}
			top := Reused
			if param == "other" {
				top = Computed
			}
			wantStates(t, r, fmt.Sprintf("root computed\na computed\nb computed\ntop %s", top))
			warnings := strings.Join(r.Warnings(), "\n")
			for _, part := range []string{"the output of root was computed again", "the output of a was computed again", "the output of b was computed again", "store.db.damaged"} {
				if !strings.Contains(warnings, part) {
					t.Errorf("warnings\n%s\nlack %s", warnings, part)
				}
			}
			again := mustRun(t, graph(param), s, Options{})
			wantStates(t, again, "root reused\na reused\nb reused\ntop reused")
			if len(again.Warnings()) > 0 {
				t.Error(again.Warnings())
			}
		})
	}
}

// A node that does not give the same bytes again cannot be repaired, for what
// stands below it came from the lost ones.
func TestLostForGood(t *testing.T) {
	dir := t.TempDir()
	s := openStore(t, dir)
	var runs atomic.Int32
	fickle := func(param string) *Graph {
		top := work("top", []string{"fickle"}, func(_ context.Context, job Job) ([]byte, error) { return job.Input("fickle") })
		top.Params = []string{param}
		return mustGraph(t, work("fickle", nil, func(context.Context, Job) ([]byte, error) { return fmt.Append(nil, "fickle output ", runs.Add(1)), nil }), top)
	}
	mustRun(t, fickle("one"), s, Options{})
	s.Close()
	spoilOutputs(t, dir, "fickle output 1")
	r := mustRun(t, fickle("two"), openStore(t, dir), Options{})
	wantStates(t, r, "fickle reused\ntop failed")
	if err := r.Err(); !strings.Contains(err.Error(), "recipe.hcl:7: top: the output of fickle cannot be read (its stored bytes are damaged") || !strings.Contains(err.Error(), "comes out different when computed again") {
		t.Error(err)
	}
}

// Outputs are not kept: a run of many large ones needs no more memory than a
// run of a few.
func TestMemoryDoesNotGrow(t *testing.T) {
	const size = 4 << 20
	peak := func(count int) (highest uint64) {
		var nodes []Node
		for i := range count {
			nodes = append(nodes, work(fmt.Sprint("large", i), nil, func(context.Context, Job) ([]byte, error) {
				return bytes.Repeat([]byte{byte(i)}, size), nil
			}))
		}
		runtime.GC()
		var m runtime.MemStats
		mustRun(t, mustGraph(t, nodes...), openStore(t, t.TempDir()), Options{Workers: 2, Events: func(e Event) {
			if e.Type == Finished {
				runtime.GC()
				runtime.ReadMemStats(&m)
				highest = max(highest, m.HeapAlloc)
			}
		}})
		return highest
	}
	few, many := peak(20), peak(80)
	// What waits for the disk is bounded by maxUnstoredBytes, and what runs adds to it.
	if limit := uint64(maxUnstoredBytes + 6*size + 8<<20); few > limit || many > limit {
		t.Errorf("%d MB of memory for 20 nodes, %d MB for 80, limit %d MB", few>>20, many>>20, limit>>20)
	}
	t.Logf("%d MB of memory for 20 nodes, %d MB for 80", few>>20, many>>20)
}

// No lock is held while a node computes: another store on the same folder can
// be read and written meanwhile.
func TestStoreIsFreeWhileComputing(t *testing.T) {
	dir := t.TempDir()
	other, err := cache.Open(dir, cache.Options{Wait: 50 * time.Millisecond})
	if err != nil {
		t.Fatal(err)
	}
	defer other.Close()
	s := openStore(t, dir)
	inner := mustGraph(t, work("inner", nil, text("inner")))
	outer := work("outer", []string{"first"}, func(ctx context.Context, job Job) ([]byte, error) {
		r, err := Run(ctx, inner, other, Options{Recipe: "inner"})
		if err != nil || r.Result("inner").State != Computed {
			return nil, fmt.Errorf("%v %v", err, r.Result("inner").State)
		}
		return []byte("outer"), nil
	})
	r := mustRun(t, mustGraph(t, work("first", nil, text("first")), outer), s, Options{})
	if r.Err() != nil || len(r.Warnings()) > 0 || len(other.Warnings()) > 0 {
		t.Error(r.Err(), r.Warnings(), other.Warnings())
	}
	wantStates(t, mustRun(t, inner, s, Options{}), "inner reused")
}

// Where nothing can be stored everything is computed all the same, and said once.
func TestStoreThatCannotBeWritten(t *testing.T) {
	file := filepath.Join(t.TempDir(), "file")
	os.WriteFile(file, nil, 0o666)
	s := openStore(t, filepath.Join(file, "store"))
	large := strings.Repeat("large ", 20000)
	g := mustGraph(t, join("a", large, nil, nil), join("b", "b", []string{"a"}, nil), join("c", "c", []string{"b"}, nil))
	r := mustRun(t, g, s, Options{Workers: 3})
	wantStates(t, r, "a computed\nb computed\nc computed")
	if out, err := r.Output(t.Context(), "c"); err != nil || string(out) != "c(b("+large+"))" {
		t.Errorf("%.20q, %v", out, err)
	}
	if w := r.Warnings(); len(w) != 1 || !strings.Contains(w[0], "kept in memory only") {
		t.Errorf("warnings %q", w)
	}
	again := mustRun(t, g, s, Options{}) // the same store, as when several recipes share nodes
	wantStates(t, again, "a reused\nb reused\nc reused")
	if w := again.Warnings(); len(w) != 0 {
		t.Errorf("warnings %q", w)
	}
}
