package infer

import (
	"math"
	"sort"
)

// refit moves a mixture towards the posterior known by weighted points: one
// step of expectation–maximisation for t components, which lowers the
// Kullback–Leibler divergence (Cappé et al. 2008). weights sum to one. Parts
// that explain nothing are dropped; the prior's share follows too, but not
// below defence.
func (m *mixture) refit(points [][]float64, weights []float64) *mixture {
	d, parts := m.dim, len(m.parts)
	t, d2, y := make([]float64, 1+parts), make([]float64, parts), make([]float64, d)
	share, square, pull := make([]float64, 1+parts), make([]float64, parts), make([]float64, parts)
	sums := rows(parts, d)
	covs := rows(parts, d*d)
	for i, z := range points {
		if weights[i] == 0 {
			continue
		}
		total := m.terms(t, d2, y, z)
		share[0] += weights[i] * math.Exp(t[0]-total)
		for k := range parts {
			r := weights[i] * math.Exp(t[1+k]-total)
			if r < 1e-300 {
				continue
			}
			share[1+k] += r
			square[k] += r * r
			u := r * (m.dof + float64(d)) / (m.dof + d2[k])
			pull[k] += u
			for a := range d {
				// About the old mean, to keep digits.
				za := z[a] - m.parts[k].mean[a]
				sums[k][a] += u * za
				for b := 0; b <= a; b++ {
					covs[k][a*d+b] += u * za * (z[b] - m.parts[k].mean[b])
				}
			}
		}
	}
	var shares []float64
	var kept []part
	for k := range parts {
		if share[1+k] < 1e-3 && parts > 1 {
			continue
		}
		p := m.parts[k]
		count := 0.0
		if square[k] > 0 {
			count = share[1+k] * share[1+k] / square[k]
		}
		kept = append(kept, p.moved(share[1+k], pull[k], count, sums[k], covs[k]))
		shares = append(shares, share[1+k])
	}
	return newMixture(d, m.dof, share[0], shares, kept)
}

// moved returns the part with the mean and covariance of the points it answers
// for, leaning on its old covariance as if that were d+2 points more.
func (p part) moved(share, pull, count float64, sum, cov []float64) part {
	d := len(p.mean)
	if !(pull > 0) || count < 2 {
		return p
	}
	q := part{mean: make([]float64, d), factor: make([]float64, d*d)}
	lean := float64(d+2) / (count + float64(d+2))
	for a := range d {
		q.mean[a] = p.mean[a] + sum[a]/pull
	}
	for a := range d {
		for b := 0; b <= a; b++ {
			old := dot(p.factor[a*d:a*d+d], p.factor[b*d:b*d+d])
			fresh := (cov[a*d+b] - sum[a]*sum[b]/pull) / share
			q.factor[a*d+b] = (1-lean)*fresh + lean*old
		}
	}
	if !cholesky(q.factor, d) {
		return p
	}
	return q
}

// grow adds a part where the mixture is thinnest: about the point of largest
// weight, with the covariance of its nearest neighbours (incremental mixture
// importance sampling, Steele, Raftery & Emond 2006).
func (m *mixture) grow(points [][]float64, weights []float64) *mixture {
	top := 0
	for i, w := range weights {
		if w > weights[top] {
			top = i
		}
	}
	centre := points[top]
	d := m.dim
	t, d2, y := make([]float64, 1+len(m.parts)), make([]float64, len(m.parts)), make([]float64, d)
	m.terms(t, d2, y, centre)
	near := 0
	for k := range m.parts {
		if t[1+k] > t[1+near] {
			near = k
		}
	}
	metric := m.parts[near].factor
	type neighbour struct {
		i int
		d float64
	}
	all := make([]neighbour, len(points))
	for i, z := range points {
		all[i] = neighbour{i, whitened(y, metric, z, centre)}
	}
	sort.Slice(all, func(a, b int) bool {
		return all[a].d < all[b].d || all[a].d == all[b].d && all[a].i < all[b].i
	})
	all = all[:min(len(all), max(len(points)/20, 10*d))]
	p := part{mean: append([]float64(nil), centre...), factor: make([]float64, d*d)}
	total, floor := 0.0, 1/float64(len(points))
	share := 0.0
	for _, n := range all {
		w := (weights[n.i] + floor) / 2
		total += w
		share += weights[n.i]
		for a := range d {
			for b := 0; b <= a; b++ {
				p.factor[a*d+b] += w * (points[n.i][a] - centre[a]) * (points[n.i][b] - centre[b])
			}
		}
	}
	for i := range p.factor {
		p.factor[i] /= total
	}
	if !cholesky(p.factor, d) {
		return m
	}
	shares := append(append([]float64(nil), m.shares[1:]...), max(share, 0.02))
	return newMixture(d, m.dof, m.shares[0], shares, append(append([]part(nil), m.parts...), p))
}
