package xray

import (
	"math"

	"gonum.org/v1/gonum/integrate/quad"
)

// The radial grid and the weights that turn an integral over radius into a sum
// over its nodes. They depend on the bins and on one reference density only, so
// they are computed once; a likelihood is then sums of products.
//
// Every integrand is a known factor times a smooth ratio. The known factor (the
// geometry, the reference density) is integrated as it is; the ratio is
// interpolated in ln r by polynomials of degree five through its node values.
const (
	// nodesPerEfold is how many nodes there are in a factor e of radius; the
	// integrals then err by less than 1e-7 (TestProjectionReference).
	nodesPerEfold = 8
	// reach is how far the line of sight goes, in units of the outer edge of the
	// data; beyond it the last node's temperature stands for the rest, less than
	// 1e-6 of the emission of a β = ⅔ gas.
	reach = 20
	// core is the innermost node in units of the smallest edge above zero.
	core = 0.01
	// points is the number of nodes of an interpolating polynomial.
	points = 6
)

// radial is a grid of radii in kpc, evenly spaced in ln r, with the outer edge
// of the data on one of its nodes.
type radial struct {
	r, ln []float64
	step  float64
	edge  int // index of the outer edge of the data
}

// newRadial spans core·inner to reach·outer with the given nodes per factor e.
func newRadial(inner, outer, density float64) *radial {
	below := int(math.Ceil(math.Log(outer/(core*inner)) * density))
	above := int(math.Ceil(math.Log(reach) * density))
	g := &radial{step: 1 / density, edge: below}
	for j := -below; j <= above; j++ {
		ln := math.Log(outer) + float64(j)*g.step
		g.ln = append(g.ln, ln)
		g.r = append(g.r, math.Exp(ln))
	}
	return g
}

// gauss holds the nodes and weights of the ten-point Gauss–Legendre rule on
// −1…1.
var gauss = func() (g struct{ x, w [10]float64 }) {
	quad.Legendre{}.FixedLocations(g.x[:], g.w[:], -1, 1)
	return g
}()

// first returns the first node of the polynomial used between nodes j and j+1.
// No polynomial reaches across the outer edge of the data, where the
// temperature may have a kink.
func (g *radial) first(j int) int {
	if j < g.edge {
		return min(max(j-points/2+1, 0), g.edge-points+1)
	}
	return min(max(j-points/2+1, g.edge), len(g.r)-points)
}

// add adds weight·L_k(ln r) to out for the nodes k of the polynomial that
// covers the interval j.
func (g *radial) add(out []float64, j int, ln, weight float64) {
	first := g.first(j)
	for k, l := range lagrange((ln - g.ln[first]) / g.step) {
		out[first+k] += weight * l
	}
}

// lagrange returns the polynomials L_k that are one at k and zero at the other
// whole numbers from 0 to points−1, taken at t.
func lagrange(t float64) (l [points]float64) {
	for k := range points {
		l[k] = 1
		for m := range points {
			if m != k {
				l[k] *= (t - float64(m)) / float64(k-m)
			}
		}
	}
	return l
}

// outside returns weights w with Σ w_j q(r_j) = ∫ f q dV over the gas that lies
// outside the cylinder of radius R along the line of sight and inside the last
// node. With u the coordinate along the line of sight, dV = 4π u² du and
// r² = R² + u², which leaves nothing singular at r = R.
func (g *radial) outside(R float64, f func(float64) float64) []float64 {
	out := make([]float64, len(g.r))
	if R == 0 {
		// A sphere below the first node, where f is a power of r.
		r := g.r[0]
		slope := math.Log(f(r*1.01)/f(r)) / math.Log(1.01)
		out[0] = 4 * math.Pi * r * r * r * f(r) / (3 + slope)
	}
	for j := range len(g.r) - 1 {
		if g.r[j+1] <= R {
			continue
		}
		u0 := math.Sqrt(math.Max(g.r[j]*g.r[j]-R*R, 0))
		u1 := math.Sqrt(g.r[j+1]*g.r[j+1] - R*R)
		half := (u1 - u0) / 2
		for q, x := range gauss.x {
			u := u0 + half*(1+x)
			r := math.Hypot(R, u)
			g.add(out, j, math.Log(r), 4*math.Pi*u*u*f(r)*half*gauss.w[q])
		}
	}
	return out
}

// annulus returns weights w with Σ w_j q(r_j) = ∫ f q dV over the cylindrical
// shell between projected radii r1 and r2, infinitely long.
func (g *radial) annulus(r1, r2 float64, f func(float64) float64) []float64 {
	out, beyond := g.outside(r1, f), g.outside(r2, f)
	for j := range out {
		out[j] -= beyond[j]
	}
	// Beyond the last node dV → 2π (r2² − r1²) dr and f is a power of r.
	n := len(g.r) - 1
	slope := math.Log(f(g.r[n])/f(g.r[n-1])) / g.step
	out[n] += 2 * math.Pi * (r2*r2 - r1*r1) * g.r[n] * f(g.r[n]) / (-slope - 1)
	return out
}

// shell returns weights w with Σ w_j q(r_j) = ∫ f q dV over the spherical shell
// between r1 and r2.
func (g *radial) shell(r1, r2 float64, f func(float64) float64) []float64 {
	out := make([]float64, len(g.r))
	if r1 < g.r[0] {
		slope := math.Log(f(g.r[0]*1.01)/f(g.r[0])) / math.Log(1.01)
		inside := func(r float64) float64 {
			if r == 0 {
				return 0
			}
			return 4 * math.Pi * r * r * r * f(g.r[0]) * math.Pow(r/g.r[0], slope) / (3 + slope)
		}
		out[0] = inside(g.r[0]) - inside(r1)
	}
	for j := range len(g.r) - 1 {
		a, b := math.Max(g.r[j], r1), math.Min(g.r[j+1], r2)
		if a >= b {
			continue
		}
		half := (b - a) / 2
		for q, x := range gauss.x {
			r := a + half*(1+x)
			g.add(out, j, math.Log(r), 4*math.Pi*r*r*f(r)*half*gauss.w[q])
		}
	}
	return out
}

// steps returns for each interval the points weights w with
// Σ w_k q(r_first+k) = ∫ f q dr between its ends.
func (g *radial) steps(f func(float64) float64) [][points]float64 {
	out := make([][points]float64, len(g.r)-1)
	row := make([]float64, len(g.r))
	for j := range out {
		clear(row)
		half := g.step / 2
		for q, x := range gauss.x {
			ln := g.ln[j] + half*(1+x)
			r := math.Exp(ln)
			g.add(row, j, ln, f(r)*r*half*gauss.w[q])
		}
		copy(out[j][:], row[g.first(j):])
	}
	return out
}
