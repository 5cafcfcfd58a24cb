package lensing

import (
	"math"

	"gonum.org/v1/gonum/integrate/quad"
	"gonum.org/v1/gonum/mat"
)

// areaNodes returns n Gauss–Legendre nodes in ln R between inner and outer,
// weighted by the area 2πR dR: the mean over an annulus evenly filled with
// sources. A disc begins at a thousandth of its radius, without 1e-6 of its
// area.
func areaNodes(inner, outer float64, n int) []Node {
	inner = max(inner, outer/1000)
	x, w := make([]float64, n), make([]float64, n)
	quad.Legendre{}.FixedLocations(x, w, math.Log(inner), math.Log(outer))
	nodes, total := make([]Node, n), 0.0
	for i := range nodes {
		r := math.Exp(x[i])
		nodes[i] = Node{r, w[i] * r * r}
		total += nodes[i].Share
	}
	for i := range nodes {
		nodes[i].Share /= total
	}
	return nodes
}

// areaCount is how many nodes average the shear of an annulus to better than
// 1e-6 of itself, tested on NFW haloes.
func areaCount(inner, outer float64) int {
	return 2 + int(math.Ceil(3*math.Log(outer/max(inner, outer/1000))))
}

// momentNodes returns the Gauss quadrature whose nodes and shares reproduce the
// first moments m[k] = Σ w u^k of the sources' own distribution in u, a
// coordinate running from −1 at the inner edge to 1 at the outer edge in ln R:
// an average over the sources where they are, without keeping them. With six
// moments there are three nodes, fewer where the sources stand at fewer places.
//
// The recurrence coefficients follow from the moments by Chebyshev's algorithm,
// the nodes from the eigenvalues of the Jacobi matrix (Golub & Welsch 1969,
// Math. Comp. 23, 221; Gautschi 2004, Orthogonal Polynomials, §2.1.7, from
// memory).
func momentNodes(m []float64, inner, outer float64) []Node {
	n := len(m) / 2
	diagonal, below := make([]float64, n), make([]float64, n)
	last, now := make([]float64, 2*n), append([]float64(nil), m...)
	diagonal[0] = m[1] / m[0]
	size := n
	for k := 1; k < n; k++ {
		next := make([]float64, 2*n)
		for l := k; l < 2*n-k; l++ {
			next[l] = now[l+1] - diagonal[k-1]*now[l] - below[k-1]*last[l]
		}
		// The squared norm of the next polynomial, relative to the last: rounding
		// alone when the sources stand at only k places.
		below[k] = next[k] / now[k-1]
		if !(below[k] > 1e-9) {
			size = k
			break
		}
		diagonal[k] = next[k+1]/next[k] - now[k]/now[k-1]
		last, now = now, next
	}
	jacobi := mat.NewSymDense(size, nil)
	for k := range size {
		jacobi.SetSym(k, k, diagonal[k])
		if k > 0 {
			jacobi.SetSym(k, k-1, math.Sqrt(below[k]))
		}
	}
	var eigen mat.EigenSym
	if !eigen.Factorize(jacobi, true) {
		panic("lensing: a symmetric matrix of three rows has no eigenvalues")
	}
	var vectors mat.Dense
	eigen.VectorsTo(&vectors)
	middle, half := (math.Log(inner)+math.Log(outer))/2, math.Log(outer/inner)/2
	nodes := make([]Node, size)
	for k, u := range eigen.Values(nil) {
		v := vectors.At(0, k)
		nodes[k] = Node{math.Exp(middle + half*u), v * v}
	}
	return nodes
}
