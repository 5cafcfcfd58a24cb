package engine

import (
	"bytes"
	"context"
	"crypto/sha256"
	"fmt"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"steelyard/cache"
)

// The test binary runs itself in processes that are killed: the variable names
// the store's folder.
const childVar = "STEELYARD_ENGINE_TEST_STORE"

func TestMain(m *testing.M) {
	if dir := os.Getenv(childVar); dir != "" {
		s, err := cache.Open(dir, cache.Options{})
		if err == nil {
			_, err = Run(context.Background(), mortal(), s, Options{Recipe: "mortal", Workers: 3, Events: func(e Event) {
				if e.Type == Finished && e.State == Computed {
					fmt.Println(e.Node) // unbuffered: known to the parent from here on
				}
			}})
		}
		if err != nil {
			fmt.Println("error:", err)
			os.Exit(1)
		}
		fmt.Println("done")
		os.Exit(0)
	}
	os.Exit(m.Run())
}

// mortal is a graph of 120 nodes in layers; every sixth output is large.
func mortal() *Graph {
	var nodes []Node
	for i := range 120 {
		n := Node{ID: fmt.Sprint("node", i), Kind: "test/mortal", Params: []string{fmt.Sprint("number ", i)}}
		if i >= 6 {
			n.Inputs = []string{fmt.Sprint("node", i-6), fmt.Sprint("node", i-5-i%2)}
		}
		n.Run = func(_ context.Context, job Job) (Output, error) {
			h := sha256.New()
			h.Write(job.Key[:])
			for _, id := range n.Inputs {
				b, err := job.Input(id)
				if err != nil {
					return Output{}, err
				}
				h.Write(b)
			}
			time.Sleep(time.Millisecond)
			out := h.Sum(nil)
			if i%6 == 0 {
				out = bytes.Repeat(out, 3000)
			}
			return Output{Bytes: out}, nil
		}
		nodes = append(nodes, n)
	}
	g, err := NewGraph(nodes)
	if err != nil {
		panic(err)
	}
	return g
}

// Processes are killed at random moments, one after another on the same store:
// it opens each time, every node that was finished is there and whole, and in
// the end the same digits come out as in an undisturbed run.
func TestKilledAtAnyInstant(t *testing.T) {
	kills := 60
	switch {
	case os.Getenv("STEELYARD_SLOW") != "":
		kills = 1000
	case testing.Short():
		kills = 15
	}
	whole := mustRun(t, mortal(), openStore(t, t.TempDir()), Options{Recipe: "mortal"})
	r := rand.New(rand.NewPCG(9, 10))
	for round, left := 0, kills; left > 0; round++ {
		dir := filepath.Join(t.TempDir(), "store")
		finished := map[string]bool{}
		for ; left > 0 && len(finished) < 110; left-- {
			c := exec.Command(os.Args[0])
			c.Env = append(os.Environ(), childVar+"="+dir)
			var out bytes.Buffer
			c.Stdout, c.Stderr = &out, &out
			if err := c.Start(); err != nil {
				t.Fatal(err)
			}
			time.Sleep(time.Duration(5+r.IntN(60)) * time.Millisecond)
			c.Process.Kill()
			c.Wait()
			lines := strings.Split(out.String(), "\n")
			for _, id := range lines[:len(lines)-1] {
				if id == "done" {
					continue
				}
				if finished[id] {
					t.Fatalf("%s was computed twice", id)
				}
				finished[id] = true
			}
			s, err := cache.Open(dir, cache.Options{})
			if err != nil {
				t.Fatal(err)
			}
			list, err := Inspect(t.Context(), mortal(), s, Options{Recipe: "mortal"})
			if err != nil {
				t.Fatal(err)
			}
			for _, p := range list {
				if finished[p.Node.ID] && p.State != Reused {
					t.Fatalf("%s was finished and is %s: %s", p.Node.ID, p.State, p.Reason)
				}
				if p.State == Reused {
					finished[p.Node.ID] = true // committed, and killed before it could say so
				}
			}
			if w := s.Warnings(); len(w) > 0 {
				t.Fatalf("warnings: %q", w)
			}
			s.Close()
		}
		s := openStore(t, dir)
		if c, err := s.Check(t.Context(), false); err != nil || len(c.Problems) > 0 {
			t.Fatalf("%+v, %v", c, err)
		}
		again := mustRun(t, mortal(), s, Options{Recipe: "mortal"})
		for _, result := range again.Results() {
			want := whole.Result(result.Node.ID)
			if result.Digest != want.Digest {
				t.Fatalf("%s came out different", result.Node.ID)
			}
			if finished[result.Node.ID] && result.State != Reused {
				t.Fatalf("%s was computed again", result.Node.ID)
			}
		}
		t.Logf("store %d: %d nodes had survived, %d kills left", round, len(finished), left)
	}
}
