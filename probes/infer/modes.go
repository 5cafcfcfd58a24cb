package infer

import (
	"context"
	"math"
	"sort"

	"gonum.org/v1/gonum/mat"
)

// mode is a maximum of the posterior with the normal distribution that fits it.
type mode struct {
	z      []float64
	logp   float64
	factor []float64 // Cholesky factor of the covariance
}

// distance is the Mahalanobis distance of z from the mode.
func (m mode) distance(z []float64) float64 {
	return math.Sqrt(whitened(make([]float64, len(z)), m.factor, z, m.z))
}

// lnMass is ln of the probability under the mode in Laplace's approximation.
func (m mode) lnMass() float64 {
	d := len(m.z)
	return m.logp + lnDet(m.factor, d) + float64(d)*lnRoot2Pi
}

const (
	climbsAtOnce = 8    // a constant: what one batch learns reaches the next
	unseenMass   = 0.01 // see findModes
)

// findModes climbs from the surveyed points, the promising and the remote in
// turn, until the share of the posterior's basins not yet seen is expected to
// be below one per cent: with w modes after n climbs that share is
// w(w+1)/n(n−1) (Boender & Rinnooy Kan 1987).
func findModes(ctx context.Context, t *target, z [][]float64, logp []float64) ([]mode, error) {
	order := startOrder(z, logp)
	var found []mode
	for n := 0; n < len(order); {
		batch := make([]*climb, min(climbsAtOnce, len(order)-n))
		err := t.each(ctx, len(batch), func(w *worker, v *visit, i int) error {
			from := order[n+i]
			c := &climb{dim: t.dim, left: 40 * (t.dim + 2), known: found, logp: logp[from]}
			c.z = append(c.z, z[from]...)
			c.eval = func(z []float64) (float64, error) { return t.logPosterior(w, v, z) }
			batch[i] = c
			return c.run()
		})
		if err != nil {
			return nil, err
		}
		for _, c := range batch {
			if c.merged || known(found, c.z) {
				continue
			}
			m, err := t.curvature(ctx, c)
			if err != nil {
				return nil, err
			}
			if !known(found, m.z) {
				found = append(found, m)
			}
		}
		n += len(batch)
		if w := float64(len(found)); w*(w+1) < unseenMass*float64(n)*float64(n-1) {
			break
		}
	}
	return worthKeeping(found), nil
}

func known(found []mode, z []float64) bool {
	for _, m := range found {
		if m.distance(z) < 2 {
			return true
		}
	}
	return false
}

// worthKeeping orders the modes by mass and drops those that hold less than
// e⁻²⁰ of the largest.
func worthKeeping(found []mode) []mode {
	sort.SliceStable(found, func(i, j int) bool { return found[i].lnMass() > found[j].lnMass() })
	for i, m := range found {
		if m.lnMass() < found[0].lnMass()-20 {
			return found[:i]
		}
	}
	return found
}

// startOrder ranks the surveyed points: the best, then by turns the one
// farthest from all chosen and the best left. Impossible points are left out.
func startOrder(z [][]float64, logp []float64) []int {
	var left []int
	for i, l := range logp {
		if !math.IsInf(l, -1) {
			left = append(left, i)
		}
	}
	sort.SliceStable(left, func(a, b int) bool { return logp[left[a]] > logp[left[b]] })
	if len(left) > fewStarts {
		left = left[:fewStarts]
	}
	nearest := make([]float64, len(left))
	for i := range nearest {
		nearest[i] = math.Inf(1)
	}
	var order []int
	for len(left) > 0 {
		pick := 0
		if len(order)%2 == 1 {
			for i := range left {
				if nearest[i] > nearest[pick] {
					pick = i
				}
			}
		}
		chosen := left[pick]
		order = append(order, chosen)
		left = append(left[:pick], left[pick+1:]...)
		nearest = append(nearest[:pick], nearest[pick+1:]...)
		for i, other := range left {
			sum := 0.0
			for j, s := range z[other] {
				sum += (s - z[chosen][j]) * (s - z[chosen][j])
			}
			nearest[i] = min(nearest[i], sum)
		}
	}
	return order
}

// curvature fits a normal distribution at the end of a climb. It measures
// second differences along directions that the climb left conjugate, each with
// a step over which logp falls by about a half, so that it sees the posterior
// at its own scale and not the rounding of the likelihood.
func (t *target) curvature(ctx context.Context, c *climb) (mode, error) {
	var m mode
	err := t.each(ctx, 1, func(w *worker, v *visit, _ int) error {
		p := &probe{dim: t.dim, centre: c.z, logp: c.logp, eval: func(z []float64) (float64, error) { return t.logPosterior(w, v, z) }}
		p.basis = append(p.basis, c.inverse...)
		if !cholesky(p.basis, t.dim) {
			p.basis = identity(t.dim)
		}
		var err error
		m, err = p.fit()
		return err
	})
	return m, err
}

// probe measures the curvature at one point.
type probe struct {
	eval   func(z []float64) (float64, error)
	dim    int
	centre []float64
	logp   float64
	basis  []float64 // columns are the directions; scaled to unit curvature by fit
}

func (p *probe) at(i int, hi float64, j int, hj float64) (float64, error) {
	z := make([]float64, p.dim)
	for k := range z {
		z[k] = p.centre[k] + hi*p.basis[k*p.dim+i]
		if j >= 0 {
			z[k] += hj * p.basis[k*p.dim+j]
		}
	}
	return p.eval(z)
}

func (p *probe) fit() (mode, error) {
	d := p.dim
	slope := make([]float64, d)
	for i := range d {
		if err := p.scale(i, &slope[i]); err != nil {
			return mode{}, err
		}
	}
	// In the scaled directions the Hessian of −logp has units on its diagonal.
	hess := mat.NewSymDense(d, nil)
	for i := range d {
		hess.SetSym(i, i, 1)
		for j := range i {
			var f [4]float64
			bad := false
			for k, s := range [4][2]float64{{1, 1}, {1, -1}, {-1, 1}, {-1, -1}} {
				l, err := p.at(i, s[0], j, s[1])
				if err != nil {
					return mode{}, err
				}
				f[k], bad = l, bad || math.IsInf(l, -1)
			}
			if !bad {
				hess.SetSym(i, j, -(f[0]-f[1]-f[2]+f[3])/4)
			}
		}
	}
	var eigen mat.EigenSym
	if !eigen.Factorize(hess, true) {
		return mode{}, nil
	}
	values := eigen.Values(nil)
	var vectors mat.Dense
	eigen.VectorsTo(&vectors)
	// Covariance = B V diag(1/λ) Vᵀ Bᵀ, λ kept away from zero; the Newton step is
	// the covariance times the slope.
	root := make([]float64, d*d) // B V diag(λ^−½)
	step := make([]float64, d)
	for k := range d {
		lambda := max(values[k], 0.05)
		along := 0.0
		for i := range d {
			along += vectors.At(i, k) * slope[i]
		}
		for r := range d {
			sum := 0.0
			for i := range d {
				sum += p.basis[r*d+i] * vectors.At(i, k)
			}
			root[r*d+k] = sum / math.Sqrt(lambda)
			step[r] += sum * max(min(along/lambda, 1), -1)
		}
	}
	m := mode{z: append([]float64(nil), p.centre...), logp: p.logp, factor: make([]float64, d*d)}
	for r := range d {
		for c := range d {
			m.factor[r*d+c] = dot(root[r*d:(r+1)*d], root[c*d:(c+1)*d])
		}
	}
	if !cholesky(m.factor, d) {
		m.factor = identity(d)
	}
	moved := make([]float64, d)
	for r := range d {
		moved[r] = p.centre[r] + step[r]
	}
	l, err := p.eval(moved)
	if err == nil && l > m.logp {
		m.z, m.logp = moved, l
	}
	return m, err
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
