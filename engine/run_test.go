package engine

import (
	"context"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"steelyard/cache"
)

// openStore opens a store that is closed when the test ends.
func openStore(t testing.TB, dir string) *cache.Store {
	t.Helper()
	s, err := cache.Open(dir, cache.Options{})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { s.Close() })
	return s
}

// join is a node that joins its parameter, its inputs and its files.
func join(id, param string, inputs, files []string) Node {
	return Node{
		ID: id, Kind: "test/join", Version: 1, Params: []string{"text = " + param}, Inputs: inputs, Files: files, Where: "recipe.hcl:1",
		Run: func(ctx context.Context, job Job) (Output, error) {
			out := param
			for _, in := range inputs {
				b, err := job.Input(in)
				if err != nil {
					return Output{}, err
				}
				out += "(" + string(b) + ")"
			}
			for _, f := range files {
				path, err := job.File(f)
				if err != nil {
					return Output{}, err
				}
				b, err := os.ReadFile(path)
				if err != nil {
					return Output{}, err
				}
				out += "[" + string(b) + "]"
			}
			return Output{Bytes: []byte(out), Diagnostics: []string{"joined"}}, nil
		},
	}
}

func mustGraph(t testing.TB, nodes ...Node) *Graph {
	t.Helper()
	g, err := NewGraph(nodes)
	if err != nil {
		t.Fatal(err)
	}
	return g
}

// run runs a graph that must not be interrupted.
func mustRun(t testing.TB, g *Graph, s *cache.Store, o Options) *Report {
	t.Helper()
	r, err := Run(context.Background(), g, s, o)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func states(r *Report) string {
	var b strings.Builder
	for _, n := range r.Results() {
		fmt.Fprintf(&b, "%s %s\n", n.Node.ID, n.State)
	}
	return b.String()
}

func wantStates(t *testing.T, r *Report, want string) {
	t.Helper()
	if got := states(r); got != strings.ReplaceAll(strings.TrimSpace(want), "\t", "")+"\n" {
		t.Fatalf("states are\n%swant\n%s%v %v", got, want, r.Err(), r.Warnings())
	}
}

func TestRunReusesWhatIsThere(t *testing.T) {
	dir := t.TempDir()
	file := filepath.Join(dir, "data.csv")
	os.WriteFile(file, []byte("1,2"), 0o666)
	s := openStore(t, filepath.Join(dir, "store"))
	graph := func(p string) *Graph {
		return mustGraph(t, join("c", "c", []string{"a", "b"}, nil), join("a", "a", nil, []string{file}), join("b", p, nil, nil))
	}
	r := mustRun(t, graph("b"), s, Options{})
	wantStates(t, r, "c computed\na computed\nb computed")
	out, err := r.Output(t.Context(), "c")
	if err != nil || string(out) != "c(a[1,2])(b)" {
		t.Fatalf("output %q, %v", out, err)
	}
	wantStates(t, mustRun(t, graph("b"), s, Options{}), "c reused\na reused\nb reused")
	wantStates(t, mustRun(t, graph("B"), s, Options{}), "c computed\na reused\nb computed")
	// Touching a file changes nothing; editing it does.
	now := time.Now().Add(-time.Hour)
	os.Chtimes(file, now, now)
	wantStates(t, mustRun(t, graph("B"), s, Options{}), "c reused\na reused\nb reused")
	os.WriteFile(file, []byte("1,3"), 0o666)
	wantStates(t, mustRun(t, graph("B"), s, Options{}), "c computed\na computed\nb reused")
	if rec := r.Record("a"); rec == nil || rec.Files[0].Path != file || rec.Diagnostics[0] != "joined" {
		t.Fatalf("record %+v", rec)
	}
}

func TestFailureBlocksOnlyWhatIsBelow(t *testing.T) {
	s := openStore(t, t.TempDir())
	bad := join("bad", "x", []string{"a"}, nil)
	bad.Run = func(context.Context, Job) (Output, error) { panic("boom") }
	r := mustRun(t, mustGraph(t, join("a", "a", nil, nil), bad, join("below", "b", []string{"bad"}, nil), join("beside", "c", []string{"a"}, nil)), s, Options{})
	wantStates(t, r, "a computed\nbad failed\nbelow blocked\nbeside computed")
	if got := r.Err().Error(); got != "recipe.hcl:1: bad: it stopped on an internal error: boom" {
		t.Error(got)
	}
	if got := r.Result("below").BlockedBy; got != "bad" {
		t.Error(got)
	}
}
