package reconcile

import (
	"fmt"
	"math"
	"math/rand/v2"

	"gonum.org/v1/gonum/mat"

	"steelyard/probes/infer"
)

// Joint is a set of estimates whose shared nuisances have one value in each
// draw: draw i of every profile, and Scores[i], belong together.
type Joint struct {
	N         int
	Nuisances []string    // the shared ones: named by two estimates or more
	Scores    [][]float64 // N × len(Nuisances), prior scores; nil when nothing is shared
	Profiles  []*infer.Draws
	Warnings  []string
}

// Transport makes the estimates share what they name in common.
//
// Estimate k's draws give the mean m_k and covariance V_k of the prior scores s
// of the nuisances it names. A nuisance's prior is in every posterior that
// names it and must count once, so with n_j estimates naming nuisance j the
// joint posterior of the scores is normal with
//
//	Λ = Σ_k V_k⁻¹ − diag(n_j − 1),   Λ s̄ = Σ_k V_k⁻¹ m_k .
//
// Scores s* are drawn from it, and each stored draw is carried along by the
// polynomial regression f of its ln M(r) on s: ln M(r) += f_r(s*) − f_r(s). Exact
// when all is Gaussian; where a posterior is skew in s, or moves by more than
// two of its standard deviations, a warning says that it is not.
func Transport(estimates []Estimate, stream infer.Stream) (*Joint, error) {
	j := &Joint{N: estimates[0].Draws.N}
	for _, e := range estimates {
		j.N = min(j.N, e.Draws.N)
	}
	j.Nuisances = shared(estimates)
	mixed := make([]*infer.Draws, len(estimates))
	for k, e := range estimates {
		mixed[k] = shuffled(e.Draws, j.N, stream.Sub("order of "+e.Name))
	}
	if len(j.Nuisances) == 0 {
		j.Profiles = mixed
		return j, nil
	}
	posteriors := make([]scorePosterior, len(estimates))
	for k, e := range estimates {
		p, err := scoresOf(mixed[k], j.Nuisances)
		if err != nil {
			return nil, fmt.Errorf("%s: %w", e.Name, err)
		}
		posteriors[k] = p
	}
	mean, root, err := combine(posteriors, len(j.Nuisances))
	if err != nil {
		return nil, err
	}
	j.Scores = drawScores(mean, root, j.N, stream.Sub("shared nuisances"))
	for k, e := range estimates {
		p := posteriors[k]
		if len(p.names) == 0 {
			j.Profiles = append(j.Profiles, mixed[k])
			continue
		}
		moved, err := carry(mixed[k], p, j.Scores)
		if err != nil {
			return nil, fmt.Errorf("%s: %w", e.Name, err)
		}
		j.Profiles = append(j.Profiles, moved)
		j.Warnings = append(j.Warnings, p.doubts(e.Name, j.Nuisances, mean)...)
	}
	return j, nil
}

// shared lists the nuisances named by at least two estimates, in the order in
// which they are first met.
func shared(estimates []Estimate) []string {
	count, order := map[string]int{}, []string{}
	for _, e := range estimates {
		for _, n := range e.Draws.Nuisances {
			if count[n.Name] == 0 {
				order = append(order, n.Name)
			}
			count[n.Name]++
		}
	}
	names := order[:0]
	for _, name := range order {
		if count[name] > 1 {
			names = append(names, name)
		}
	}
	return names
}

// shuffled copies n draws in random order, so that the order in which two
// samplers happened to visit their posteriors cannot pair their draws.
func shuffled(d *infer.Draws, n int, stream infer.Stream) *infer.Draws {
	order := stream.Rand(0).Perm(d.N)[:n]
	c := *d
	c.N = n
	width := len(d.Radii)
	c.LnMass = make([]float64, n*width)
	for i, from := range order {
		copy(c.LnMass[i*width:(i+1)*width], d.LnMass[from*width:(from+1)*width])
	}
	pick := func(columns []infer.Parameter) []infer.Parameter {
		out := make([]infer.Parameter, len(columns))
		for j, p := range columns {
			out[j] = infer.Parameter{Name: p.Name, Unit: p.Unit, Values: make([]float64, n)}
			for i, from := range order {
				out[j].Values[i] = p.Values[from]
			}
		}
		return out
	}
	c.Parameters, c.Nuisances = pick(d.Parameters), pick(d.Nuisances)
	return &c
}

// scorePosterior is what one estimate knows of the shared nuisances it names.
type scorePosterior struct {
	names  []int // indices into Joint.Nuisances
	scores [][]float64
	mean   []float64
	cov    *mat.SymDense
}

func scoresOf(d *infer.Draws, shared []string) (scorePosterior, error) {
	var p scorePosterior
	var columns [][]float64
	for j, name := range shared {
		for _, n := range d.Nuisances {
			if n.Name == name {
				p.names = append(p.names, j)
				columns = append(columns, n.Values)
			}
		}
	}
	if len(columns) == 0 {
		return p, nil
	}
	p.scores = make([][]float64, d.N)
	for i := range p.scores {
		p.scores[i] = make([]float64, len(columns))
		for c, column := range columns {
			p.scores[i][c] = column[i]
		}
	}
	p.mean, p.cov = moments(p.scores)
	for c, j := range p.names {
		if !(p.cov.At(c, c) > 0) {
			return p, fmt.Errorf("nuisance %q does not vary among the draws, so it cannot be shared", shared[j])
		}
	}
	return p, nil
}

// combine adds the posteriors' information, each prior counted once, and
// returns the mean and a square root of the covariance of the joint scores.
func combine(posteriors []scorePosterior, n int) ([]float64, *mat.TriDense, error) {
	lambda, h := mat.NewSymDense(n, nil), mat.NewVecDense(n, nil)
	for j := range n {
		lambda.SetSym(j, j, 1) // one prior; each posterior below adds its data only
	}
	for _, p := range posteriors {
		if len(p.names) == 0 {
			continue
		}
		var chol mat.Cholesky
		if !chol.Factorize(p.cov) {
			return nil, nil, fmt.Errorf("the draws of the shared nuisances are degenerate: two of them move as one")
		}
		var inverse mat.SymDense
		if err := chol.InverseTo(&inverse); err != nil {
			return nil, nil, fmt.Errorf("the draws of the shared nuisances are nearly degenerate: %w", err)
		}
		for a, ja := range p.names {
			for b, jb := range p.names {
				h.SetVec(ja, h.AtVec(ja)+inverse.At(a, b)*p.mean[b])
				if a <= b {
					extra := inverse.At(a, b)
					if a == b {
						extra--
					}
					lambda.SetSym(ja, jb, lambda.At(ja, jb)+extra)
				}
			}
		}
	}
	var chol mat.Cholesky
	if !chol.Factorize(lambda) {
		return nil, nil, fmt.Errorf("the posteriors of the shared nuisances cannot be combined: their joint covariance is not positive definite")
	}
	var mean mat.VecDense
	var cov mat.SymDense
	if err := chol.SolveVecTo(&mean, h); err != nil {
		return nil, nil, err
	}
	if err := chol.InverseTo(&cov); err != nil {
		return nil, nil, err
	}
	if !chol.Factorize(&cov) {
		return nil, nil, fmt.Errorf("the joint covariance of the shared nuisances is not positive definite")
	}
	root := mat.NewTriDense(n, mat.Lower, nil)
	chol.LTo(root)
	return mean.RawVector().Data, root, nil
}

// drawScores draws n sets of scores whose sample mean and covariance are exactly
// the joint posterior's, which takes their Monte Carlo noise out of every ratio.
func drawScores(mean []float64, root *mat.TriDense, n int, stream infer.Stream) [][]float64 {
	raw := make([][]float64, n)
	rng := stream.Rand(0)
	for i := range raw {
		raw[i] = normals(rng, len(mean))
	}
	m, cov := moments(raw)
	var chol mat.Cholesky
	chol.Factorize(cov) // of thousands of independent normals: positive definite
	sample := mat.NewTriDense(len(mean), mat.Lower, nil)
	chol.LTo(sample)
	for i := range raw {
		x := mat.NewVecDense(len(mean), raw[i])
		for j := range mean {
			x.SetVec(j, x.AtVec(j)-m[j])
		}
		var white, out mat.VecDense
		_ = white.SolveVec(sample, x)
		out.MulVec(root, &white)
		for j := range mean {
			raw[i][j] = mean[j] + out.AtVec(j)
		}
	}
	return raw
}

func normals(rng *rand.Rand, n int) []float64 {
	x := make([]float64, n)
	for j := range x {
		x[j] = rng.NormFloat64()
	}
	return x
}

// carry moves each draw of a profile from its own scores to the joint ones.
func carry(d *infer.Draws, p scorePosterior, joint [][]float64) (*infer.Draws, error) {
	moved := *d
	moved.LnMass = make([]float64, len(d.LnMass))
	width := len(d.Radii)
	basis := newPolynomial(p.scores)
	target := make([][]float64, d.N)
	for i := range target {
		target[i] = make([]float64, len(p.names))
		for c, j := range p.names {
			target[i][c] = joint[i][j]
		}
	}
	fit, err := basis.fit(p.scores, d.LnMass, width)
	if err != nil {
		return nil, err
	}
	before, after := make([]float64, width), make([]float64, width)
	for i := range d.N {
		fit.at(p.scores[i], before)
		fit.at(target[i], after)
		for r := range width {
			moved.LnMass[i*width+r] = d.LnMass[i*width+r] + after[r] - before[r]
		}
	}
	return &moved, nil
}

// doubts says where the Gaussian transport is not to be trusted.
func (p scorePosterior) doubts(name string, shared []string, joint []float64) []string {
	var out []string
	for c, j := range p.names {
		sd := math.Sqrt(p.cov.At(c, c))
		skew := 0.0
		for _, s := range p.scores {
			u := (s[c] - p.mean[c]) / sd
			skew += u * u * u
		}
		skew /= float64(len(p.scores))
		if math.Abs(skew) > 0.5 {
			out = append(out, fmt.Sprintf("%s: its posterior of the shared nuisance %s is skew (%.1f), so sharing it is approximate", name, shared[j], skew))
		}
		if shift := (joint[j] - p.mean[c]) / sd; math.Abs(shift) > 2 {
			out = append(out, fmt.Sprintf("%s: the other estimates move the shared nuisance %s by %.1f of its standard deviations, so sharing it is approximate and the estimates disagree about it", name, shared[j], shift))
		}
	}
	return out
}
