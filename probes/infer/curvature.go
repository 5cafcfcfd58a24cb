package infer

import (
	"errors"
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// probe measures the curvature of the log posterior at one point. It takes
// second differences along directions that a climb left conjugate, each with a
// step over which logp falls by about a half, so that it sees the posterior at
// its own scale and not the rounding of the likelihood.
type probe struct {
	eval   func(z []float64) (float64, error)
	dim    int
	centre []float64
	logp   float64
	basis  []float64 // columns are the directions; scaled to unit curvature by fit

	best    []float64 // highest point visited
	bestLog float64
}

func (p *probe) at(i int, hi float64, j int, hj float64) (float64, error) {
	z := make([]float64, p.dim)
	for k := range z {
		z[k] = p.centre[k] + hi*p.basis[k*p.dim+i]
		if j >= 0 {
			z[k] += hj * p.basis[k*p.dim+j]
		}
	}
	return p.visit(z)
}

func (p *probe) visit(z []float64) (float64, error) {
	l, err := p.eval(z)
	if err == nil && l > p.bestLog {
		p.best, p.bestLog = z, l
	}
	return l, err
}

// fit returns the normal distribution with the curvature found, about the
// highest point visited, a Newton step from the centre among them. Where the
// directions turn out far from the principal axes it measures again along these,
// for along a crooked direction a long ridge cannot be seen.
func (p *probe) fit() (mode, error) {
	d := p.dim
	p.best, p.bestLog = p.centre, p.logp
	step := make([]float64, d)
	for pass := 1; ; pass++ {
		straight, err := p.measure(step)
		if err != nil {
			return mode{}, err
		}
		if straight || pass == 3 {
			break
		}
	}
	moved := make([]float64, d)
	for r := range d {
		moved[r] = p.centre[r] + step[r]
	}
	if _, err := p.visit(moved); err != nil {
		return mode{}, err
	}
	// The basis is now a root of the covariance.
	m := mode{z: slices.Clone(p.best), logp: p.bestLog, factor: make([]float64, d*d)}
	for r := range d {
		for c := range d {
			m.factor[r*d+c] = dot(p.basis[r*d:(r+1)*d], p.basis[c*d:(c+1)*d])
		}
	}
	if !cholesky(m.factor, d) {
		m.factor = identity(d)
	}
	return m, nil
}

// measure scales the directions, finds the Hessian along them and turns them
// into its principal axes, each one standard deviation long. step is set to the
// Newton step. straight says that the directions were near the axes before.
func (p *probe) measure(step []float64) (straight bool, err error) {
	d := p.dim
	slope := make([]float64, d)
	for i := range d {
		if err := p.scale(i, &slope[i]); err != nil {
			return false, err
		}
	}
	hess, err := p.hessian()
	if err != nil {
		return false, err
	}
	var eigen mat.EigenSym
	if !eigen.Factorize(hess, true) {
		return false, errors.New("infer: the curvature at a mode could not be found")
	}
	values := eigen.Values(nil)
	var vectors mat.Dense
	eigen.VectorsTo(&vectors)
	axes := make([]float64, d*d)
	clear(step)
	for k := range d {
		lambda, along := max(values[k], 0.02), 0.0
		for i := range d {
			along += vectors.At(i, k) * slope[i]
		}
		for r := range d {
			sum := 0.0
			for i := range d {
				sum += p.basis[r*d+i] * vectors.At(i, k)
			}
			axes[r*d+k] = sum / math.Sqrt(lambda)
			step[r] += sum * max(min(along/lambda, 1), -1)
		}
	}
	copy(p.basis, axes)
	return values[0] > 0.2 && values[d-1] < 5, nil
}

// hessian returns the Hessian of −logp along the scaled directions, in which it
// has units on its diagonal.
func (p *probe) hessian() (*mat.SymDense, error) {
	hess := mat.NewSymDense(p.dim, nil)
	for i := range p.dim {
		hess.SetSym(i, i, 1)
		for j := range i {
			sum, possible := 0.0, true
			for _, s := range [4][3]float64{{1, 1, 1}, {1, -1, -1}, {-1, 1, -1}, {-1, -1, 1}} {
				l, err := p.at(i, s[0], j, s[1])
				if err != nil {
					return nil, err
				}
				sum += s[2] * l
				possible = possible && !math.IsInf(l, -1)
			}
			if possible {
				hess.SetSym(i, j, -sum/4)
			}
		}
	}
	return hess, nil
}

// scale stretches direction i until one step of it lowers logp by about ½ on
// the average of both sides, and measures the slope there.
func (p *probe) scale(i int, slope *float64) error {
	h, drop := 1.0, 0.0
	*slope = 0
	for range 12 {
		up, err := p.at(i, h, -1, 0)
		if err != nil {
			return err
		}
		down, err := p.at(i, -h, -1, 0)
		if err != nil {
			return err
		}
		switch {
		case math.IsInf(up, -1) && math.IsInf(down, -1):
			h /= 4
			continue
		case math.IsInf(up, -1):
			drop = p.logp - down
		case math.IsInf(down, -1):
			drop = p.logp - up
		default:
			drop = p.logp - (up+down)/2
			*slope = (up - down) / 2
		}
		if drop > 0.1 && drop < 2 {
			break
		}
		h *= min(max(math.Sqrt(0.5/max(drop, 1e-4)), 0.02), 4)
		if length := h * p.length(i); length > 3 {
			h *= 3 / length // never farther than the prior reaches
			break
		}
	}
	// One step is now to be the curvature's unit: drop = ½ h² at unit curvature.
	unit := h
	if drop > 0 {
		unit = h / math.Sqrt(2*drop)
	}
	unit = min(unit, 3/max(p.length(i), 1e-300))
	*slope *= unit / h
	for k := range p.dim {
		p.basis[k*p.dim+i] *= unit
	}
	return nil
}

func (p *probe) length(i int) float64 {
	sum := 0.0
	for k := range p.dim {
		sum += p.basis[k*p.dim+i] * p.basis[k*p.dim+i]
	}
	return math.Sqrt(sum)
}
