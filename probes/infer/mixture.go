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
	dim     int
	shares  []float64 // 1 + len(parts), summing to 1
	lnShare []float64
	parts   []part
}

// part is one component: a multivariate t distribution of which a small share
// is stretched, so that it also looks around the place it stands for. Without
// that, a mixture that fits most of a bent or funnel-shaped posterior never
// proposes the rest, and no weight tells.
type part struct {
	mean, factor []float64 // factor is the Cholesky factor of its scale matrix
	dof          int       // index in dofs
	lnCore       float64   // ln of share and norm of the plain t
	lnStretched  float64   // and of the stretched one
}

// dofs are the degrees of freedom a part may have.
var dofs = [...]float64{1, 2, 3, 5, 8, 15, 30}

// startDof is the index of the degrees of freedom a part starts with.
const startDof = 3

const (
	stretch      = 3.0  // in every direction
	stretchShare = 0.08 // of a part's proposals
)

// newPart returns a part; the norm of a t is
//
//	Γ((ν+d)/2) / Γ(ν/2) (νπ)^(d/2) |L|.
func newPart(mean, factor []float64, dof int) part {
	d := len(mean)
	norm := lnStudentNorm(dofs[dof], d) - lnDet(factor, d)
	return part{
		mean: mean, factor: factor, dof: dof,
		lnCore:      norm + math.Log(1-stretchShare),
		lnStretched: norm + math.Log(stretchShare) - float64(d)*math.Log(stretch),
	}
}

// both returns the logs of the core's and the stretched share's density at
// squared distance d2. (1+x loses no digit that matters here, and Log is much
// faster than Log1p.)
func (p *part) both(d2 float64) (core, stretched float64) {
	dof := dofs[p.dof]
	power := -(dof + float64(len(p.mean))) / 2
	return p.lnCore + power*math.Log(1+d2/dof), p.lnStretched + power*math.Log(1+d2/(stretch*stretch*dof))
}

// newMixture builds a mixture of the parts with shares in the given proportion,
// beside the prior with the share defending or defence, whichever is more.
func newMixture(dim int, defending float64, shares []float64, parts []part) *mixture {
	m := &mixture{dim: dim, parts: parts, shares: make([]float64, 1+len(parts)), lnShare: make([]float64, 1+len(parts))}
	total := 0.0
	for _, s := range shares {
		total += s
	}
	m.shares[0] = max(defence, defending)
	for k, s := range shares {
		m.shares[1+k] = s / total * (1 - m.shares[0])
	}
	for k, s := range m.shares {
		m.lnShare[k] = math.Log(s)
	}
	return m
}

func lnStudentNorm(dof float64, dim int) float64 {
	d := float64(dim)
	top, _ := math.Lgamma((dof + d) / 2)
	bottom, _ := math.Lgamma(dof / 2)
	return top - bottom - d/2*math.Log(dof*math.Pi)
}

// terms is the density of a mixture at one point, taken apart.
type terms struct {
	prior, total    float64   // logs: of the prior's share, of the whole
	core, stretched []float64 // logs, by part
	d2              []float64 // squared distance from each part
	y               []float64
}

func (m *mixture) newTerms() *terms {
	n := len(m.parts)
	return &terms{core: make([]float64, n), stretched: make([]float64, n), d2: make([]float64, n), y: make([]float64, m.dim)}
}

// negligible is how far below the largest term, in logarithms, one is left out.
const negligible = 40

func (t *terms) set(m *mixture, z []float64) {
	t.prior = m.lnShare[0] + lnUnitNormal(z)
	most := t.prior
	for k := range m.parts {
		p := &m.parts[k]
		t.d2[k] = whitened(t.y, p.factor, z, p.mean)
		core, stretched := p.both(t.d2[k])
		t.core[k], t.stretched[k] = m.lnShare[1+k]+core, m.lnShare[1+k]+stretched
		most = max(most, t.core[k], t.stretched[k])
	}
	sum := math.Exp(t.prior - most)
	for k, core := range t.core {
		if core > most-negligible {
			sum += math.Exp(core - most)
		}
		if t.stretched[k] > most-negligible {
			sum += math.Exp(t.stretched[k] - most)
		}
	}
	t.total = most + math.Log(sum)
}

// lnDensity returns the log density of the mixture at each point.
func (m *mixture) lnDensity(points [][]float64) []float64 {
	t := m.newTerms()
	out := make([]float64, len(points))
	for i, z := range points {
		t.set(m, z)
		out[i] = t.total
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
			scale := math.Sqrt(dofs[p.dof] / chiSquare(rng, dofs[p.dof]))
			if rng.Float64() < stretchShare {
				scale *= stretch
			}
			unwhitened(points[i], p.factor, y, p.mean, scale)
		}
	}
	return points
}

// chiSquare draws from the chi-square distribution with dof degrees of freedom
// (Marsaglia & Tsang 2000; below a shape of one by way of the shape above).
func chiSquare(rng *rand.Rand, dof float64) float64 {
	shape, boost := dof/2, 1.0
	if shape < 1 {
		boost = math.Pow(1-rng.Float64(), 1/shape)
		shape++
	}
	d := shape - 1.0/3
	c := 1 / math.Sqrt(9*d)
	for {
		x := rng.NormFloat64()
		v := 1 + c*x
		if v <= 0 {
			continue
		}
		v = v * v * v
		if math.Log(1-rng.Float64()) < x*x/2+d-d*v+d*math.Log(v) {
			return 2 * d * v * boost
		}
	}
}
