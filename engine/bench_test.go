package engine

import (
	"context"
	"fmt"
	"math/rand/v2"
	"path/filepath"
	"testing"

	"steelyard/cache"
)

// trivial is a graph of n nodes in layers of width, each reading up to three of
// the layer above.
func trivial(n, width int) []Node {
	r := rand.New(rand.NewPCG(1, 2))
	nodes := make([]Node, n)
	for i := range nodes {
		nodes[i] = Node{
			ID: fmt.Sprint("node", i), Kind: "test/trivial", Version: 1, Params: []string{fmt.Sprint("number ", i)},
			Run: func(context.Context, Job) (Output, error) { return Output{Bytes: fmt.Append(nil, i)}, nil },
		}
		if layer := i / width; layer > 0 {
			for range 3 {
				nodes[i].Inputs = append(nodes[i].Inputs, nodes[(layer-1)*width+r.IntN(width)].ID)
			}
		}
	}
	return nodes
}

func benchmarkCold(b *testing.B, n, width int) {
	g := mustGraph(b, trivial(n, width)...)
	dir := b.TempDir()
	for i := 0; b.Loop(); i++ {
		s, err := cache.Open(filepath.Join(dir, fmt.Sprint(i)), cache.Options{})
		if err != nil {
			b.Fatal(err)
		}
		if r := mustRun(b, g, s, Options{Recipe: "bench"}); r.Count(Computed) != n {
			b.Fatal(states(r))
		}
		s.Close()
	}
	b.ReportMetric(float64(b.Elapsed().Milliseconds())/float64(b.N*n), "ms/node")
}

func benchmarkWarm(b *testing.B, n, width int) {
	nodes := trivial(n, width)
	dir := b.TempDir()
	s := openStore(b, dir)
	mustRun(b, mustGraph(b, nodes...), s, Options{Recipe: "bench"})
	s.Close()
	for b.Loop() { // from opening the store to knowing every digest
		s, err := cache.Open(dir, cache.Options{})
		if err != nil {
			b.Fatal(err)
		}
		if r := mustRun(b, mustGraph(b, nodes...), s, Options{Recipe: "bench"}); r.Count(Reused) != n {
			b.Fatal(states(r))
		}
		s.Close()
	}
}

func BenchmarkCold20(b *testing.B)         { benchmarkCold(b, 20, 5) }
func BenchmarkCold10000(b *testing.B)      { benchmarkCold(b, 10000, 100) }
func BenchmarkColdChain1000(b *testing.B)  { benchmarkCold(b, 1000, 1) }
func BenchmarkUnchanged20(b *testing.B)    { benchmarkWarm(b, 20, 5) }
func BenchmarkUnchanged10000(b *testing.B) { benchmarkWarm(b, 10000, 100) }
