package reconcile

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"

	"steelyard/probes/infer"
)

// Consistency says whether all estimates of independent data agree at a place.
type Consistency struct {
	At      string
	Chi2    float64 // of ln M about the best common value, full covariance
	Dof     int     // number of estimates less one
	P       float64 // probability of contrasts less likely than none
	Sigma   float64 // two-sided equivalent of P
	Tail    bool    // a fitted tail was used
	Verdict string
	Of      []string // the estimates that entered
}

// agreement is the highest-density probability of the K−1 contrasts of ln M all
// being zero. Given the shared nuisances the estimates are independent, so the
// density of the contrasts at a point is an integral over one common ln M of the
// product of the estimates' own densities, averaged over the nuisances; its
// value at zero is compared with its values at the joint draws. For two
// estimates it is the pair's.
func agreement(m *Matched, members []int, pairs []*pair, limits [3]float64, stream infer.Stream) (Consistency, error) {
	c := Consistency{At: m.At.String(), Dof: len(members) - 1}
	for _, k := range members {
		c.Of = append(c.Of, m.Marks[k].Name)
	}
	var err error
	if c.Chi2, err = chiSquare(m, members); err != nil {
		return c, fmt.Errorf("%s: %w", m.At, err)
	}
	if len(members) == 2 {
		for _, p := range pairs {
			if p.a == members[0] && p.b == members[1] {
				c.P, c.Tail = p.density.LessLikely(0)
			}
		}
	} else {
		c.P, c.Tail = contrastsLessLikely(m, members, stream)
	}
	c.Sigma = Sigma(c.P)
	c.Verdict = Verdict(c.Sigma, limits)
	return c, nil
}

// chiSquare is Σ (x − x̄)ᵀ C⁻¹ (x − x̄) with x the mean ln M of the joint draws,
// C their covariance and x̄ the best linear unbiased common value.
func chiSquare(m *Matched, members []int) (float64, error) {
	rows := make([][]float64, len(m.LnMass[members[0]]))
	for i := range rows {
		rows[i] = make([]float64, len(members))
		for c, k := range members {
			rows[i][c] = m.LnMass[k][i]
		}
	}
	mean, cov := moments(rows)
	var chol mat.Cholesky
	if !chol.Factorize(cov) {
		return 0, fmt.Errorf("the covariance of the estimates is not positive definite")
	}
	ones := mat.NewVecDense(len(members), nil)
	for i := range members {
		ones.SetVec(i, 1)
	}
	var weight, residual mat.VecDense
	if err := chol.SolveVecTo(&weight, ones); err != nil {
		return 0, err
	}
	x := mat.NewVecDense(len(members), mean)
	common := mat.Dot(&weight, x) / mat.Dot(&weight, ones)
	x.AddScaledVec(x, -common, ones)
	if err := chol.SolveVecTo(&residual, x); err != nil {
		return 0, err
	}
	return mat.Dot(&residual, x), nil
}

const (
	recombined = 4  // times the residuals of the estimates are paired anew
	averaged   = 48 // values of the shared nuisances over which a density is averaged
	nodes      = 24 // of the integral over the common ln M
	reliable   = 30 // draws beyond zero below which a tail is fitted
)

// contrastsLessLikely is the probability of contrasts less likely than zero.
func contrastsLessLikely(m *Matched, members []int, stream infer.Stream) (p float64, fitted bool) {
	residual, common := parts(m, members)
	logs := make([]logDensity, len(members))
	for k, r := range residual {
		logs[k] = newLogDensity(r)
	}
	contrast := contrastDensity{logs: logs, shifts: spread(common, averaged)}
	contrast.prepare()
	n := len(residual[0])
	values := make([]float64, 0, recombined*n)
	x := make([]float64, len(members))
	for turn := range recombined {
		order := make([][]int, len(members))
		for k := range members {
			order[k] = stream.Sub(fmt.Sprintf("recombination %d", turn)).Rand(k).Perm(n)
		}
		for i := range n {
			for k := range members {
				x[k] = residual[k][order[k][i]]
				if common[k] != nil {
					x[k] += common[k][i]
				}
			}
			values = append(values, contrast.log(x))
		}
	}
	clear(x)
	return shareBelow(values, contrast.log(x), len(members)-1)
}

// parts separates ln M into what the shared nuisances carry and the rest.
func parts(m *Matched, members []int) (residual, common [][]float64) {
	for _, k := range members {
		r := slices.Clone(m.LnMass[k])
		if m.Common[k] != nil {
			for i := range r {
				r[i] -= m.Common[k][i]
			}
		}
		residual, common = append(residual, r), append(common, m.Common[k])
	}
	return residual, common
}

// spread picks, evenly through the draws, the shifts that the shared nuisances
// give the estimates; a single row of zeros when nothing is shared.
func spread(common [][]float64, count int) [][]float64 {
	n := 0
	for _, c := range common {
		n = max(n, len(c))
	}
	if n == 0 {
		return [][]float64{make([]float64, len(common))}
	}
	count = min(count, n)
	out := make([][]float64, count)
	for s := range out {
		out[s] = make([]float64, len(common))
		for k, c := range common {
			if c != nil {
				out[s][k] = c[s*n/count]
			}
		}
	}
	return out
}

// logDensity is the logarithm of one estimate's density of ln M, tabulated
// between its tails.
type logDensity struct {
	grid
	whole    *density
	mean, sd float64
}

func newLogDensity(x []float64) logDensity {
	d := convolve(x)
	mean, sd := meanSD(x)
	table := grid{from: d.lower.x, step: sd / 16}
	for at := table.from; at < d.upper.x+table.step; at += table.step {
		table.values = append(table.values, math.Log(max(d.at(at), 1e-300)))
	}
	return logDensity{table, d, mean, sd}
}

func (l *logDensity) log(x float64) float64 {
	if x < l.whole.lower.x || x > l.whole.upper.x {
		return l.whole.log(x)
	}
	return l.at(x)
}

// contrastDensity gives the log density of the contrasts of a set of ln M.
type contrastDensity struct {
	logs   []logDensity
	shifts [][]float64 // of each estimate, one row a value of the shared nuisances
	narrow int         // the estimate with the least spread, whose width sets the nodes
}

func (c *contrastDensity) prepare() {
	for k, l := range c.logs {
		if l.sd < c.logs[c.narrow].sd {
			c.narrow = k
		}
	}
}

// log integrates the product of the estimates' densities over a common shift of
// x. The trapezium rule converges geometrically for smooth densities; the nodes
// span where the product of normals of the estimates' means and spreads peaks.
func (c *contrastDensity) log(x []float64) float64 {
	total := 0.0
	best := math.Inf(-1)
	terms := make([]float64, 0, len(c.shifts)*nodes)
	for _, shift := range c.shifts {
		weight, sum := 0.0, 0.0
		for k, l := range c.logs {
			w := 1 / (l.sd * l.sd)
			weight += w
			sum += w * (x[k] - shift[k] - l.mean)
		}
		center, width := sum/weight, 1/math.Sqrt(weight)
		for i := range nodes {
			u := center + width*(float64(i)/(nodes-1)-0.5)*10
			log := math.Log(width)
			for k := range c.logs {
				log += c.logs[k].log(x[k] - shift[k] - u)
			}
			best = max(best, log)
			terms = append(terms, log)
		}
	}
	for _, t := range terms {
		total += math.Exp(t - best)
	}
	return best + math.Log(total)
}

// shareBelow is the share of values below level. With fewer than reliable of
// them it is read off the χ² law with dof degrees of freedom, which −2 ln of the
// density over its greatest follows when all is normal, stretched to pass
// through the reliable-th smallest.
func shareBelow(values []float64, level float64, dof int) (p float64, fitted bool) {
	slices.Sort(values)
	count := 0
	for count < len(values) && values[count] < level {
		count++
	}
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
