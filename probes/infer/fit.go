package infer

import (
	"cmp"
	"math"
	"slices"
)

// leastShare is the least share of a part; one that deserves less than a tenth
// of it is dropped.
const leastShare = 0.003

// refit moves a mixture towards the distribution known by weighted points: one
// step of expectation–maximisation for t components, which lowers the
// Kullback–Leibler divergence (Cappé et al. 2008). weights sum to one. Parts
// that explain nothing are dropped; the prior's share follows too, but not
// below defence.
func (m *mixture) refit(points [][]float64, weights []float64) *mixture {
	d, parts := m.dim, len(m.parts)
	t := m.newTerms()
	sums := make([]moments, parts)
	for k := range sums {
		sums[k] = newMoments(d)
	}
	defending := 0.0
	for i, z := range points {
		t.set(m, z)
		defending += weights[i] * math.Exp(t.prior-t.total)
		for k := range parts {
			if max(t.core[k], t.stretched[k]) > t.total-negligible {
				core, stretched := math.Exp(t.core[k]-t.total), math.Exp(t.stretched[k]-t.total)
				sums[k].add(&m.parts[k], z, t.d2[k], weights[i]*core, weights[i]*stretched)
			}
		}
	}
	largest := 0 // stays, however little is left beside the prior
	for k := range parts {
		if sums[k].share > sums[largest].share {
			largest = k
		}
	}
	var shares []float64
	var kept []part
	for k := range parts {
		if sums[k].share > leastShare/10 || k == largest {
			kept = append(kept, m.parts[k].moved(&sums[k]))
			shares = append(shares, max(sums[k].share, leastShare))
		}
	}
	return newMixture(d, defending, shares, kept)
}

// moments is what one part answers for: its share of the weight and the sums
// over points, each pulling as hard as the t distribution lets it.
type moments struct {
	share, core, square, pull float64
	mean, cov                 []float64  // about the part's old mean, to keep digits
	fit                       [3]float64 // log likelihood, but for the norm, with the dofs before, as they are, after
}

func newMoments(d int) moments { return moments{mean: make([]float64, d), cov: make([]float64, d*d)} }

func (s *moments) add(p *part, z []float64, d2, core, stretched float64) {
	d := len(z)
	r := core + stretched
	s.share += r
	s.core += core
	s.square += r * r
	u := (dofs[p.dof] + float64(d)) * (core/(dofs[p.dof]+d2) + stretched/(stretch*stretch*dofs[p.dof]+d2))
	s.pull += u
	for a := range d {
		za := z[a] - p.mean[a]
		s.mean[a] += u * za
		for b := 0; b <= a; b++ {
			s.cov[a*d+b] += u * za * (z[b] - p.mean[b])
		}
	}
	for n := range s.fit {
		if k := p.dof + n - 1; k >= 0 && k < len(dofs) {
			s.fit[n] -= core * (dofs[k] + float64(d)) / 2 * math.Log(1+d2/dofs[k])
		}
	}
}

// moved returns the part with the mean, covariance and degrees of freedom of the
// points it answers for, leaning on its old covariance as if that were d+2
// points more.
func (p *part) moved(s *moments) part {
	d := len(p.mean)
	count := s.share * s.share / s.square
	if !(s.pull > 0) || !(count >= 2) {
		return *p
	}
	mean, factor := make([]float64, d), make([]float64, d*d)
	lean := float64(d+2) / (count + float64(d+2))
	for a := range d {
		mean[a] = p.mean[a] + s.mean[a]/s.pull
	}
	for a := range d {
		for b := 0; b <= a; b++ {
			old := dot(p.factor[a*d:a*d+d], p.factor[b*d:b*d+d])
			fresh := (s.cov[a*d+b] - s.mean[a]*s.mean[b]/s.pull) / s.share
			factor[a*d+b] = (1-lean)*fresh + lean*old
		}
	}
	if !cholesky(factor, d) {
		return *p
	}
	best, most := p.dof, math.Inf(-1)
	for n, fit := range s.fit {
		if k := p.dof + n - 1; k >= 0 && k < len(dofs) {
			if fit += s.core * lnStudentNorm(dofs[k], d); fit > most {
				best, most = k, fit
			}
		}
	}
	return newPart(mean, factor, best)
}

// grow adds a part where the mixture falls shortest of the posterior: about the
// point of largest ratio, with the covariance of its nearest neighbours
// (incremental mixture importance sampling, Steele, Raftery & Emond 2006).
// weights are the points' importance weights, summing to one.
func (m *mixture) grow(points [][]float64, logp, weights []float64) *mixture {
	d, top, most := m.dim, 0, math.Inf(-1)
	for i, l := range m.lnDensity(points) {
		if logp[i]-l > most {
			top, most = i, logp[i]-l
		}
	}
	centre := points[top]
	metric := m.nearest(centre)
	type neighbour struct {
		i int
		d float64
	}
	all, y := make([]neighbour, len(points)), make([]float64, d)
	for i, z := range points {
		all[i] = neighbour{i, whitened(y, metric, z, centre)}
	}
	slices.SortFunc(all, func(a, b neighbour) int { return cmp.Or(cmp.Compare(a.d, b.d), a.i-b.i) })
	all = all[:min(len(all), max(len(points)/20, 10*d))]
	factor := make([]float64, d*d)
	total, share, floor := 0.0, 0.0, 1/float64(len(points))
	for _, n := range all {
		w := (weights[n.i] + floor) / 2
		total += w
		share += weights[n.i]
		for a := range d {
			for b := 0; b <= a; b++ {
				factor[a*d+b] += w * (points[n.i][a] - centre[a]) * (points[n.i][b] - centre[b])
			}
		}
	}
	for i := range factor {
		factor[i] /= total
	}
	if !cholesky(factor, d) {
		return m
	}
	mean := append([]float64(nil), centre...)
	return newMixture(d, m.shares[0], append(slices.Clone(m.shares[1:]), max(share, 0.02)), append(slices.Clone(m.parts), newPart(mean, factor, startDof)))
}

// nearest returns the factor of the part most probably responsible for z.
func (m *mixture) nearest(z []float64) []float64 {
	t := m.newTerms()
	t.set(m, z)
	near := 0
	for k := range m.parts {
		if max(t.core[k], t.stretched[k]) > max(t.core[near], t.stretched[near]) {
			near = k
		}
	}
	return m.parts[near].factor
}
