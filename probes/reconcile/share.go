package reconcile

import (
	"context"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"

	"steelyard/probes/infer"
)

// Joint says which draws of the estimates belong together when each shared
// nuisance has one value: joint draw i has the nuisance scores Scores[i], and
// takes draw Order[k][i] of estimate k, carried from its own scores to these.
type Joint struct {
	N         int
	Nuisances []string    // the shared ones: named by two estimates or more
	Scores    [][]float64 // N × len(Nuisances), prior scores; nil when nothing is shared
	Order     [][]int
	Sampled   bool // the scores were sampled rather than drawn from a normal law
	// Tilts asks for an estimate to be made again under other priors of what it
	// shares: the draws it has hardly reach where the others put the nuisances.
	// Nil when none need be; one list an estimate otherwise, empty for one that
	// shares nothing.
	Tilts    [][]Tilt
	Warnings []string
}

// Share makes the estimates share what they name in common.
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
// when all is Gaussian.
//
// Where Λ is not positive definite, or a posterior is skew in s by more than
// 0.5, or would be moved by more than two of its standard deviations, the
// scores are sampled from the product of the posteriors themselves (sample).
// In the last case Tilts says with which priors the estimates should be made
// again: what the others and the prior together know of the nuisances, in the
// normal approximation (a round of expectation propagation: Minka 2001). Their
// tilts are taken out again when they are shared.
func Share(ctx context.Context, estimates []Estimate, stream infer.Stream) (*Joint, error) {
	j := &Joint{N: estimates[0].Draws.N}
	for _, e := range estimates {
		j.N = min(j.N, e.Draws.N)
	}
	for _, e := range estimates {
		// Random order, so that the order in which two samplers happened to visit
		// their posteriors cannot pair their draws.
		j.Order = append(j.Order, stream.Sub("order of " + e.Name).Rand(0).Perm(e.Draws.N)[:j.N])
	}
	var once []string
	j.Nuisances, once = shared(estimates)
	for _, name := range once {
		j.Warnings = append(j.Warnings, fmt.Sprintf("nuisance.%s is named by one of the compared estimates only: nothing shares it", name))
	}
	if len(j.Nuisances) == 0 {
		return j, nil
	}
	posteriors := make([]scorePosterior, len(estimates))
	for k, e := range estimates {
		p, err := scoresOf(e, j.Nuisances)
		if err != nil {
			return nil, fmt.Errorf("%s: %w", e.Name, err)
		}
		posteriors[k] = p
		j.Warnings = append(j.Warnings, p.againstPrior(e.Name, j.Nuisances)...)
	}
	law, ok := newScoreLaw(posteriors, len(j.Nuisances))
	var doubts []string
	if !ok {
		doubts = []string{"the posteriors of the shared nuisances have no normal law in common"}
	}
	moved := false
	again := slices.ContainsFunc(estimates, func(e Estimate) bool { return e.Tilts != nil })
	far := 2.0
	if again {
		// They were made again to lie where they meet; half-way is not there.
		far, doubts = 1, append(doubts, "the estimates were made again where they meet")
	}
	for k, e := range estimates {
		doubts = append(doubts, posteriors[k].skew(e.Name, j.Nuisances)...)
		if ok {
			apart := posteriors[k].moved(e.Name, j.Nuisances, law.mean, far)
			doubts, moved = append(doubts, apart...), moved || len(apart) > 0
		}
	}
	if len(doubts) == 0 {
		j.Scores = law.draw(j.N, stream.Sub("shared nuisances"))
		return j, nil
	}
	if moved {
		j.Tilts = law.without(posteriors, j.Nuisances)
	}
	return j, j.sample(ctx, estimates, posteriors, doubts, stream.Sub("sampled nuisances"))
}

// shared lists the nuisances named by at least two estimates, and those named
// by one, in the order in which they are first met.
func shared(estimates []Estimate) (names, once []string) {
	count := map[string]int{}
	var order []string
	for _, e := range estimates {
		for _, n := range e.Draws.Nuisances {
			if count[n.Name] == 0 {
				order = append(order, n.Name)
			}
			count[n.Name]++
		}
	}
	for _, name := range order {
		if count[name] > 1 {
			names = append(names, name)
		} else {
			once = append(once, name)
		}
	}
	return names, once
}

// scorePosterior is what one estimate knows of the shared nuisances it names.
type scorePosterior struct {
	names  []int       // indices into Joint.Nuisances
	priors []Tilt      // that the estimate was made with, one a name
	scores [][]float64 // of every stored draw
	mean   []float64
	cov    *mat.SymDense
}

func scoresOf(e Estimate, shared []string) (scorePosterior, error) {
	var p scorePosterior
	var columns [][]float64
	d := e.Draws
	for j, name := range shared {
		for _, n := range d.Nuisances {
			if n.Name == name {
				p.names, p.priors = append(p.names, j), append(p.priors, e.prior(name))
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
			p.scores[i][c] = p.priors[c].Mean + p.priors[c].SD*column[i]
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

// sd is the standard deviation of the estimate's c-th score.
func (p scorePosterior) sd(c int) float64 { return math.Sqrt(p.cov.At(c, c)) }

// skew says which scores have a posterior that is not normal.
func (p scorePosterior) skew(name string, shared []string) []string {
	var out []string
	for c, j := range p.names {
		sd, skew := p.sd(c), 0.0
		for _, s := range p.scores {
			u := (s[c] - p.mean[c]) / sd
			skew += u * u * u
		}
		if skew /= float64(len(p.scores)); math.Abs(skew) > 0.5 {
			out = append(out, fmt.Sprintf("%s knows nuisance.%s with a skewness of %.1f", name, shared[j], skew))
		}
	}
	return out
}

// moved says which scores the others put more than far standard deviations from
// where this estimate alone has them. joint is the mean of the joint scores.
func (p scorePosterior) moved(name string, shared []string, joint []float64, far float64) []string {
	var out []string
	for c, j := range p.names {
		if shift := (joint[j] - p.mean[c]) / p.sd(c); math.Abs(shift) > far {
			out = append(out, fmt.Sprintf("the other estimates move nuisance.%s by %.1f of the standard deviations that %s leaves it", shared[j], shift, name))
		}
	}
	return out
}

// againstPrior says which nuisances the estimate's data pull away from their
// prior. For a normal posterior (m, v) in prior scores the data alone lie
// m/√(1 − v) of the expected scatter from the prior's centre.
func (p scorePosterior) againstPrior(name string, shared []string) []string {
	var out []string
	for c, j := range p.names {
		// A posterior as wide as the prior says nothing of its own.
		told := 1 - p.cov.At(c, c)
		if told < 0.05 || p.priors[c] != (Tilt{shared[j], 0, 1}) {
			continue
		}
		if pull := p.mean[c] / math.Sqrt(told); math.Abs(pull) > 2 {
			out = append(out, fmt.Sprintf("%s: its data and the prior of nuisance.%s disagree by %.1fσ", name, shared[j], math.Abs(pull)))
		}
	}
	return out
}
