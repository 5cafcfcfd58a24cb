package infer

import (
	"math"
	"math/rand/v2"
	"sort"
)

// defence is the least share of proposals drawn from the prior itself, so that
// no weight exceeds its likelihood over defence times the evidence.
const defence = 0.05

// mixture is the proposal: multivariate t distributions and, with weight
// shares[0], the prior.
type mixture struct {
	dim    int
	dof    float64
	shares []float64 // 1 + len(parts), summing to 1
	parts  []part
	lnNorm float64 // of the t density, without the determinant
}

type part struct {
	mean, factor []float64
	lnDet        float64
}

func newMixture(dim int, dof float64, defending float64, shares []float64, parts []part) *mixture {
	m := &mixture{dim: dim, parts: parts, shares: make([]float64, 1+len(parts))}
	total := 0.0
	for _, s := range shares {
		total += s
	}
	m.shares[0] = max(defence, defending)
	if total == 0 {
		m.shares[0] = 1
	}
	for k, s := range shares {
		m.shares[1+k] = 0
		if total > 0 {
			m.shares[1+k] = s / total * (1 - m.shares[0])
		}
		m.parts[k].lnDet = lnDet(parts[k].factor, dim)
	}
	m.setDof(dof)
	return m
}

// setDof sets the degrees of freedom of every t, and with them its norm
// Γ((ν+d)/2) / Γ(ν/2) (νπ)^(d/2).
func (m *mixture) setDof(dof float64) {
	d := float64(m.dim)
	top, _ := math.Lgamma((dof + d) / 2)
	bottom, _ := math.Lgamma(dof / 2)
	m.dof, m.lnNorm = dof, top-bottom-d/2*math.Log(dof*math.Pi)
}

// terms sets t[k] to the log of share times density of component k (0 is the
// prior) and d2[k] to the squared distance from part k; it returns the log of
// the mixture's density.
func (m *mixture) terms(t, d2, y, z []float64) float64 {
	t[0] = math.Log(m.shares[0]) + lnUnitNormal(z)
	most := t[0]
	for k, p := range m.parts {
		d2[k] = whitened(y, p.factor, z, p.mean)
		t[1+k] = math.Log(m.shares[1+k]) + m.lnNorm - p.lnDet - (m.dof+float64(m.dim))/2*math.Log1p(d2[k]/m.dof)
		most = max(most, t[1+k])
	}
	sum := 0.0
	for _, v := range t {
		sum += math.Exp(v - most)
	}
	return most + math.Log(sum)
}

// lnDensity returns the log density of the mixture at each point.
func (m *mixture) lnDensity(points [][]float64) []float64 {
	t, d2, y := make([]float64, 1+len(m.parts)), make([]float64, len(m.parts)), make([]float64, m.dim)
	out := make([]float64, len(points))
	for i, z := range points {
		out[i] = m.terms(t, d2, y, z)
	}
	return out
}

// draw makes n proposals, the number from each component as even as can be:
// proposal i belongs to the component in whose share (i + u_i)/n falls.
// Generator c of the stream makes chunk c.
func (m *mixture) draw(n int, s Stream) [][]float64 {
	ends := make([]float64, len(m.shares))
	sum := 0.0
	for k, share := range m.shares {
		sum += share
		ends[k] = sum
	}
	points := rows(n, m.dim)
	y := make([]float64, m.dim)
	for c := range chunks(n) {
		rng := s.Rand(c)
		for i := c * chunk; i < min((c+1)*chunk, n); i++ {
			u := (float64(i) + rng.Float64()) / float64(n) * sum
			k := min(sort.SearchFloat64s(ends, u), len(ends)-1)
			for j := range y {
				y[j] = rng.NormFloat64()
			}
			if k == 0 {
				copy(points[i], y)
				continue
			}
			p := m.parts[k-1]
			unwhitened(points[i], p.factor, y, p.mean, math.Sqrt(m.dof/chiSquare(rng, m.dof)))
		}
	}
	return points
}

// chiSquare draws from the chi-square distribution with dof degrees of freedom
// (Marsaglia & Tsang 2000, for a shape of at least one).
func chiSquare(rng *rand.Rand, dof float64) float64 {
	d := dof/2 - 1.0/3
	c := 1 / math.Sqrt(9*d)
	for {
		x := rng.NormFloat64()
		v := 1 + c*x
		if v <= 0 {
			continue
		}
		v = v * v * v
		if math.Log(1-rng.Float64()) < x*x/2+d-d*v+d*math.Log(v) {
			return 2 * d * v
		}
	}
}
