package reconcile

import (
	"cmp"
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
	nodes    = 16      // of the integral over the common ln M
	effort   = 6000000 // evaluations of one estimate's density that an agreement may cost
	reliable = 30      // draws beyond zero below which a tail is fitted
)

// contrastsLessLikely is the probability of contrasts less likely than zero. The
// residuals of the estimates are paired anew as often as the effort allows, at
// most four times.
func contrastsLessLikely(m *Matched, members []int, stream infer.Stream) (p float64, fitted bool) {
	residual, common := parts(m, members)
	contrast := newContrastDensity(residual, common)
	n := len(residual[0])
	turns := min(max(effort/(n*len(members)*nodes*len(contrast.shifts)), 1), 4)
	values := make([]float64, 0, turns*n)
	x := make([]float64, len(members))
	for turn := range turns {
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

// spread picks the shifts that the shared nuisances give the estimates: rows of
// draws evenly spaced in the order of the shift that varies most, as many as it
// takes for neighbours to lie within a third of the narrowest residual, at least
// 8 and at most 64. A single row of zeros when nothing is shared.
func spread(residual, common [][]float64) [][]float64 {
	widest, most, narrowest := -1, 0.0, math.Inf(1)
	for k, c := range common {
		_, sd := meanSD(residual[k])
		narrowest = min(narrowest, sd)
		if c == nil {
			continue
		}
		if _, sd := meanSD(c); widest < 0 || sd > most {
			widest, most = k, sd
		}
	}
	if widest < 0 {
		return [][]float64{make([]float64, len(common))}
	}
	n := len(common[widest])
	order := make([]int, n)
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int { return cmp.Compare(common[widest][a], common[widest][b]) })
	count := min(max(int(15*most/narrowest), 8), 64, n)
	out := make([][]float64, count)
	for s := range out {
		out[s] = make([]float64, len(common))
		for k, c := range common {
			if c != nil {
				out[s][k] = c[order[(2*s+1)*n/(2*count)]]
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
	weight []float64   // of each estimate in the best common value
	width  float64     // error of the best common value
	terms  []float64   // scratch
}

func newContrastDensity(residual, common [][]float64) *contrastDensity {
	c := &contrastDensity{shifts: spread(residual, common)}
	total := 0.0
	for _, r := range residual {
		l := newLogDensity(r)
		c.logs = append(c.logs, l)
		c.weight = append(c.weight, 1/(l.sd*l.sd))
		total += 1 / (l.sd * l.sd)
	}
	for k := range c.weight {
		c.weight[k] /= total
	}
	c.width = 1 / math.Sqrt(total)
	c.terms = make([]float64, len(c.shifts)*nodes)
	return c
}

// log integrates the product of the estimates' densities over a common shift of
// x. The trapezium rule converges geometrically for smooth densities; its nodes
// span five widths on both sides of where a product of normals would peak.
func (c *contrastDensity) log(x []float64) float64 {
	best := math.Inf(-1)
	for s, shift := range c.shifts {
		center := 0.0
		for k := range c.logs {
			center += c.weight[k] * (x[k] - shift[k] - c.logs[k].mean)
		}
		for i := range nodes {
			u := center + c.width*(float64(i)/(nodes-1)-0.5)*10
			log := 0.0
			for k := range c.logs {
				log += c.logs[k].log(x[k] - shift[k] - u)
			}
			best = max(best, log)
			c.terms[s*nodes+i] = log
		}
	}
	total := 0.0
	for _, t := range c.terms {
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
