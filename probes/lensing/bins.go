package lensing

import (
	"fmt"
	"math"

	"steelyard/probes/method"
)

// fewest is the smallest number of bins a profile may have.
const fewest = 3

// binEdges returns the edges in kpc that a `bins` block asks for.
func binEdges(s method.Settings) ([]float64, error) {
	from, to, count, list := s["from"], s["to"], s["count"], s["edges"]
	if list.Set {
		if from.Set || to.Set || count.Set {
			return nil, fmt.Errorf("bins: give `edges`, or `from`, `to` and `count`, not both")
		}
		return checkedEdges(list.Numbers)
	}
	if !from.Set || !to.Set || !count.Set {
		return nil, fmt.Errorf("bins: `from`, `to` and `count` are needed together, or `edges`")
	}
	lo, hi, n := from.Prior.A, to.Prior.A, int(count.Prior.A)
	switch {
	case n < fewest:
		return nil, fmt.Errorf("bins: count = %d; at least %d bins are needed", n, fewest)
	case !(lo > 0):
		return nil, fmt.Errorf("bins: `from` must be above zero, for the bins are logarithmic")
	case !(hi > lo):
		return nil, fmt.Errorf("bins: `to` (%.4g kpc) must lie beyond `from` (%.4g kpc)", hi, lo)
	}
	edges := make([]float64, n+1)
	for i := range edges {
		edges[i] = lo * math.Pow(hi/lo, float64(i)/float64(n))
	}
	edges[n] = hi
	return edges, nil
}

func checkedEdges(edges []float64) ([]float64, error) {
	if len(edges) < fewest+1 {
		return nil, fmt.Errorf("bins: %d edges make %d bins; at least %d bins are needed", len(edges), max(len(edges)-1, 0), fewest)
	}
	if !(edges[0] > 0) {
		return nil, fmt.Errorf("bins: the first edge must be above zero")
	}
	for i := 1; i < len(edges); i++ {
		if !(edges[i] > edges[i-1]) {
			return nil, fmt.Errorf("bins: edge %d (%.4g kpc) does not lie beyond edge %d (%.4g kpc)", i+1, edges[i], i, edges[i-1])
		}
	}
	return edges, nil
}
