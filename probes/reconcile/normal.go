package reconcile

import (
	"math"
	"math/rand/v2"
	"slices"

	"gonum.org/v1/gonum/mat"

	"steelyard/probes/infer"
)

// scoreLaw is the normal law of the joint scores.
type scoreLaw struct {
	precision *mat.SymDense // Λ
	h         []float64     // Λ times the mean
	mean      []float64
	root      *mat.TriDense // of the covariance
}

// newScoreLaw adds the posteriors' information to the prior's, each prior counted
// once; false when that leaves no covariance.
func newScoreLaw(posteriors []scorePosterior, n int) (*scoreLaw, bool) {
	lambda, h := mat.NewSymDense(n, nil), make([]float64, n)
	for j := range n {
		lambda.SetSym(j, j, 1) // one prior; each posterior below adds its data only
	}
	for _, p := range posteriors {
		if !p.addTo(lambda, h, 1) {
			return nil, false
		}
	}
	mean, cov, ok := solveLaw(lambda, h)
	var chol mat.Cholesky
	if !ok || !chol.Factorize(cov) {
		return nil, false
	}
	root := mat.NewTriDense(n, mat.Lower, nil)
	chol.LTo(root)
	return &scoreLaw{lambda, h, mean, root}, true
}

// addTo adds what an estimate's data alone say of the scores, times a sign.
func (p scorePosterior) addTo(lambda *mat.SymDense, h []float64, sign float64) bool {
	if len(p.names) == 0 {
		return true
	}
	var chol mat.Cholesky
	var inverse mat.SymDense
	if !chol.Factorize(p.cov) || chol.InverseTo(&inverse) != nil {
		return false
	}
	for a, ja := range p.names {
		q := p.priors[a]
		h[ja] -= sign * q.Mean / (q.SD * q.SD)
		lambda.SetSym(ja, ja, lambda.At(ja, ja)-sign/(q.SD*q.SD))
		for b, jb := range p.names {
			h[ja] += sign * inverse.At(a, b) * p.mean[b]
			if a <= b {
				lambda.SetSym(ja, jb, lambda.At(ja, jb)+sign*inverse.At(a, b))
			}
		}
	}
	return true
}

func solveLaw(lambda *mat.SymDense, h []float64) (mean []float64, cov *mat.SymDense, ok bool) {
	var chol mat.Cholesky
	var solved mat.VecDense
	cov = mat.NewSymDense(len(h), nil)
	if !chol.Factorize(lambda) || chol.SolveVecTo(&solved, mat.NewVecDense(len(h), slices.Clone(h))) != nil || chol.InverseTo(cov) != nil {
		return nil, nil, false
	}
	return solved.RawVector().Data, cov, true
}

// without is, for each estimate, the law of the scores it names when its own data
// are left out; nil when for some estimate there is none.
func (l *scoreLaw) without(posteriors []scorePosterior, nuisances []string) [][]Tilt {
	out := make([][]Tilt, len(posteriors))
	for k, p := range posteriors {
		lambda, h := mat.NewSymDense(len(l.h), nil), slices.Clone(l.h)
		lambda.CopySym(l.precision)
		p.addTo(lambda, h, -1)
		mean, cov, ok := solveLaw(lambda, h)
		if !ok {
			return nil
		}
		for _, j := range p.names {
			out[k] = append(out[k], Tilt{nuisances[j], mean[j], math.Sqrt(cov.At(j, j))})
		}
	}
	return out
}

// draw draws n sets of scores whose sample mean and covariance are exactly the
// law's, which takes their Monte Carlo noise out of every ratio. n is large
// against the number of scores.
func (l *scoreLaw) draw(n int, stream infer.Stream) [][]float64 {
	out := make([][]float64, n)
	rng := stream.Rand(0)
	for i := range out {
		out[i] = normals(rng, len(l.mean))
	}
	m, cov := moments(out)
	var chol mat.Cholesky
	chol.Factorize(cov) // of independent normals: positive definite
	sample := mat.NewTriDense(len(l.mean), mat.Lower, nil)
	chol.LTo(sample)
	white := make([]float64, len(l.mean))
	for _, x := range out {
		for a := range white {
			white[a] = x[a] - m[a]
			for b := range a {
				white[a] -= sample.At(a, b) * white[b]
			}
			white[a] /= sample.At(a, a)
		}
		for a := range x {
			x[a] = l.mean[a]
			for b := range a + 1 {
				x[a] += l.root.At(a, b) * white[b]
			}
		}
	}
	return out
}

func normals(rng *rand.Rand, n int) []float64 {
	x := make([]float64, n)
	for j := range x {
		x[j] = rng.NormFloat64()
	}
	return x
}
