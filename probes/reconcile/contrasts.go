package reconcile

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"

	"gonum.org/v1/gonum/mat"

	"steelyard/probes/infer"
)

// logDensity is the logarithm of a density known by draws, tabulated.
type logDensity struct {
	grid
	whole    *density
	mean, sd float64
}

func newLogDensity(x []float64) *logDensity {
	const perSD, reach = 16, 7 // points a standard deviation, and how many of them out
	d := convolve(x)
	l := &logDensity{whole: d}
	l.mean, l.sd = meanSD(x)
	l.grid = grid{from: l.mean - reach*l.sd, step: l.sd / perSD, values: make([]float64, 2*reach*perSD+1)}
	for i := range l.values {
		l.values[i] = max(d.log(l.x(i)), -1e4)
	}
	return l
}

func (l *logDensity) log(x float64) float64 {
	u := (x - l.from) / l.step
	if u >= 0 && u < float64(len(l.values)-1) {
		i := int(u)
		return l.values[i] + (u-float64(i))*(l.values[i+1]-l.values[i])
	}
	return max(l.whole.log(x), -1e4)
}

// addTo adds to each sum the log density at x less so many steps of the table.
func (l *logDensity) addTo(sums []float64, x float64, steps []float64) {
	at, last := (x-l.from)/l.step, float64(len(l.values)-1)
	for i, s := range steps {
		u := at - s
		if !(u >= 0 && u < last) {
			sums[i] += l.log(x - s*l.step)
			continue
		}
		j := int(u)
		v := l.values[j : j+2]
		sums[i] += v[0] + (u-float64(j))*(v[1]-v[0])
	}
}

func logDensities(parts [][]float64) []*logDensity {
	out := make([]*logDensity, len(parts))
	for k, p := range parts {
		out[k] = newLogDensity(p)
	}
	return out
}

// contrastDensity gives the density of the differences between K values of
// ln M. Given the shared nuisances the estimates are independent, so it is an
// integral over one common u and the scores z of what is shared,
//
//	f(x) = ∫ du dz φ(z) Π_k p_k(x_k − c_k − u − Σ_d G_kd z_d) ,
//
// p_k being the density of estimate k's residuals, c_k the mean of its shared
// part and G the loadings of the shared parts' principal components. (That the
// shared parts are taken as normal shapes the contours of f only; how probable a
// contour is, is counted on the draws.)
type contrastDensity struct {
	logs   []*logDensity
	center []float64   // c_k + the mean of the residuals
	load   [][]float64 // B = [1 G], K × D
	gain   [][]float64 // D × K: y = (u, z) at the peak is gain·(x − center) for normal p_k
	offset [][]float64 // of each estimate, where the nodes lie in steps of its table
	score  [][]float64 // of each node, in z
	volume float64     // ln of the cell of a node, with the norm of φ(z)
	terms  []float64   // scratch
	peak   []float64   // scratch
	base   []float64   // scratch
}

// directions is how many components of what is shared are integrated over; more
// than two nuisances rarely matter at once.
const directions = 2

// Nodes of the trapezium rule by the number of axes: how many of a normal
// integrand's standard deviations apart, and the square of how many steps from
// the peak. The rule converges geometrically: for a normal integrand the error is
// exp(−2π²/spacing²), below 2e-4. Outside the ball lies less than 3e-2 of it; the
// weights are those that give a normal integrand exactly.
var (
	spacing = [...]float64{1: 1, 2: 1.5, 3: 1.5}
	reach   = [...]int{1: 16, 2: 5, 3: 4}
)

func newContrastDensity(logs []*logDensity, common [][]float64) *contrastDensity {
	c := &contrastDensity{logs: logs}
	shared := mat.NewSymDense(len(logs), nil)
	narrowest := math.Inf(1)
	for k, l := range logs {
		narrowest = min(narrowest, l.sd*l.sd)
		mean := 0.0
		if common[k] != nil {
			mean, _ = meanSD(common[k])
			for m := range k + 1 {
				if common[m] != nil {
					shared.SetSym(k, m, covarianceOf(common[k], common[m]))
				}
			}
		}
		c.center = append(c.center, l.mean+mean)
		c.load = append(c.load, []float64{1})
	}
	c.loadings(shared, narrowest)
	c.prepare()
	return c
}

// loadings appends the principal components of the shared parts' covariance
// that matter beside the residuals.
func (c *contrastDensity) loadings(shared *mat.SymDense, narrowest float64) {
	var eigen mat.EigenSym
	if !eigen.Factorize(shared, true) {
		return
	}
	values := eigen.Values(nil) // rising
	var vectors mat.Dense
	eigen.VectorsTo(&vectors)
	for i := len(values) - 1; i >= max(0, len(values)-directions) && values[i] > 1e-4*narrowest; i-- {
		for k := range c.load {
			c.load[k] = append(c.load[k], vectors.At(k, i)*math.Sqrt(values[i]))
		}
	}
}

// prepare solves for the peak of a normal integrand and lays the nodes about it.
func (c *contrastDensity) prepare() {
	dims := len(c.load[0])
	precision := mat.NewSymDense(dims, nil)
	for a := 1; a < dims; a++ {
		precision.SetSym(a, a, 1)
	}
	for k, row := range c.load {
		w := 1 / (c.logs[k].sd * c.logs[k].sd)
		for a := range row {
			for b := a; b < dims; b++ {
				precision.SetSym(a, b, precision.At(a, b)+w*row[a]*row[b])
			}
		}
	}
	var chol mat.Cholesky
	var cov mat.SymDense
	chol.Factorize(precision) // the prior of z and one weight make it positive definite
	_ = chol.InverseTo(&cov)
	chol.Factorize(&cov)
	root := mat.NewTriDense(dims, mat.Lower, nil)
	chol.LTo(root)
	c.gain, c.peak, c.base = make([][]float64, dims), make([]float64, dims), make([]float64, len(c.load))
	nodes := ball(dims)
	c.offset = make([][]float64, len(c.load))
	c.volume = -float64(dims-1) / 2 * math.Log(2*math.Pi)
	for a := range dims {
		c.volume += math.Log(root.At(a, a) * math.Sqrt(2*math.Pi))
		c.gain[a] = make([]float64, len(c.load))
		for k, row := range c.load {
			for b := range row {
				c.gain[a][k] += cov.At(a, b) * row[b] / (c.logs[k].sd * c.logs[k].sd)
			}
		}
	}
	normal := 0.0
	for _, q := range nodes {
		y, square := make([]float64, dims), 0.0
		for a, x := range q {
			square += x * x
			for b := a; b < dims; b++ {
				y[b] += root.At(b, a) * x
			}
		}
		normal += math.Exp(-square / 2)
		for k, row := range c.load {
			sum := 0.0
			for a, g := range row {
				sum += g * y[a]
			}
			c.offset[k] = append(c.offset[k], sum/c.logs[k].step)
		}
		c.score = append(c.score, y[1:])
	}
	c.volume -= math.Log(normal)
	c.terms = make([]float64, len(nodes))
}

// ball lists the nodes, in standard deviations from the peak.
func ball(dims int) [][]float64 {
	nodes := [][]float64{nil}
	for range dims {
		var more [][]float64
		for _, q := range nodes {
			for i := -4; i <= 4; i++ {
				next := append(slices.Clone(q), float64(i)*spacing[dims])
				square := 0.0
				for _, x := range next {
					square += x * x
				}
				if square <= float64(reach[dims])*spacing[dims]*spacing[dims]+1e-9 {
					more = append(more, next)
				}
			}
		}
		nodes = more
	}
	return nodes
}

// log is the logarithm of the density at the differences of x.
func (c *contrastDensity) log(x []float64) float64 {
	for a, gain := range c.gain {
		c.peak[a] = 0
		for k, g := range gain {
			c.peak[a] += g * (x[k] - c.center[k])
		}
	}
	for k, row := range c.load {
		c.base[k] = x[k] - c.center[k] + c.logs[k].mean
		for a, g := range row {
			c.base[k] -= g * c.peak[a]
		}
	}
	for i, score := range c.score {
		sum := 0.0
		for a, z := range score {
			z += c.peak[a+1]
			sum -= z * z / 2
		}
		c.terms[i] = sum
	}
	for k, b := range c.base {
		c.logs[k].addTo(c.terms, b, c.offset[k])
	}
	best := slices.Max(c.terms)
	total := 0.0
	for _, t := range c.terms {
		if t > best-15 { // the rest adds less than 1e-4
			total += math.Exp(t - best)
		}
	}
	return best + math.Log(total) + c.volume
}

const (
	effort   = 400000 // evaluations of one estimate's density that an agreement may cost
	fewest   = 500    // points at which the density is evaluated, whatever the effort
	reliable = 30     // draws beyond zero below which a tail is fitted
)

// lessLikely is the probability of differences less likely than none. The
// residuals of the estimates are paired anew as often as the effort allows, at
// most four times; where it does not allow all draws, as many as it does.
func (c *contrastDensity) lessLikely(residual, common [][]float64, effort int, stream infer.Stream) (p float64, fitted bool) {
	draws := len(residual[0])
	points := min(max(effort/(len(residual)*len(c.terms)), fewest), 4*draws)
	values := make([]float64, 0, points)
	x := make([]float64, len(residual))
	for turn := 0; len(values) < points; turn++ {
		order := make([][]int, len(residual))
		for k := range residual {
			order[k] = someOf(stream.Sub(fmt.Sprintf("recombination %d", turn)).Rand(k), draws, points-len(values))
		}
		for i := range min(draws, points-len(values)) {
			for k, r := range residual {
				x[k] = r[order[k][i]]
				if common[k] != nil {
					x[k] += common[k][i]
				}
			}
			values = append(values, c.log(x))
		}
	}
	clear(x)
	return shareBelow(values, c.log(x), len(residual)-1)
}

// someOf lists all of n draws in random order, or as many as are needed if that
// is less, at random.
func someOf(rng *rand.Rand, n, needed int) []int {
	if needed >= n {
		return rng.Perm(n)
	}
	order := make([]int, needed)
	for i := range order {
		order[i] = rng.IntN(n)
	}
	return order
}

// shareBelow is the share of values below level. With fewer than reliable of
// them it is read off the χ² law with dof degrees of freedom, which −2 ln of the
// density over its greatest follows when all is normal, stretched to pass
// through the reliable-th smallest.
func shareBelow(values []float64, level float64, dof int) (p float64, fitted bool) {
	slices.Sort(values)
	count, _ := slices.BinarySearch(values, level)
	if count >= reliable {
		return float64(count) / float64(len(values)), false
	}
	top := values[len(values)-1]
	edge := 2 * (top - values[reliable-1])
	target := float64(reliable) / float64(len(values))
	lo, hi := 0.0, 1.0
	for infer.ChiSquareP(hi*edge, dof) > target {
		hi *= 2
	}
	for range 60 {
		mid := (lo + hi) / 2
		if infer.ChiSquareP(mid*edge, dof) > target {
			lo = mid
		} else {
			hi = mid
		}
	}
	return max(infer.ChiSquareP(hi*2*(top-level), dof), 1e-300), true
}
