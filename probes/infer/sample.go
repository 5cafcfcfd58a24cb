package infer

import (
	"context"
	"fmt"
	"math"
)

const defaultDraws = 4000

// DrawPosterior draws from a posterior by adaptive importance sampling, falling
// back to an affine-invariant ensemble. An error means that no draws could be
// made at all (no point of finite likelihood, context cancelled); draws that
// do not pass their diagnostics come with Quality.Converged false.
func DrawPosterior(ctx context.Context, p Problem, o Options) (*Sample, error) {
	if o.Draws == 0 {
		o.Draws = defaultDraws
	}
	if o.Draws < 0 {
		return nil, fmt.Errorf("infer: %d draws are asked for", o.Draws)
	}
	t, err := newTarget(p, o.Workers)
	if err != nil {
		return nil, err
	}
	z, logp, err := survey(ctx, t, o.Stream.Sub("starts").Rand(0))
	if err != nil {
		return nil, err
	}
	modes, err := findModes(ctx, t, z, logp)
	if err != nil {
		return nil, err
	}
	var c cloud
	c.add(z, logp, priorDensity)
	var f *final
	for attempt := 1; ; attempt++ {
		work := o.Stream.Sub(fmt.Sprintf("attempt %d", attempt))
		m, efficiency, err := t.adapt(ctx, startMixture(t.dim, modes), &c, work)
		if err != nil {
			return nil, err
		}
		// The mixture is frozen from here.
		if f, err = t.propose(ctx, m, proposals(o.Draws, efficiency), work.Sub("final")); err != nil {
			return nil, err
		}
		if f.passes() && f.shape < heavyRound || f.efficiency() < hopeless || attempt == mostAttempts {
			break
		}
		c.add(f.z, f.logp, m.lnDensity)
	}
	if f.passes() {
		return t.importanceSample(f, o.Draws, modes, o.Stream.Sub("resample")), nil
	}
	s, err := t.ensembleSample(ctx, modes, o.Draws, o.Stream)
	if err != nil {
		return nil, err
	}
	s.Warnings = append([]string{fmt.Sprintf(
		"importance sampling did not settle (tail shape %.2f, efficiency %.3f): the draws come from an affine-invariant ensemble and carry no evidence",
		f.shape, f.efficiency())}, s.Warnings...)
	return s, nil
}

const (
	mostAttempts   = 3
	mostTailShape  = 0.7  // of weights that can be used (Vehtari et al. 2024)
	leastEfficient = 0.1  // effective size over size of the final proposals
	hopeless       = 0.05 // efficiency at which another attempt is not worth its time
	fewestDraws    = 500
)

// proposals is how many points are drawn from a frozen mixture of the given
// efficiency for n draws: three times as many when it is good, up to ten, and
// never so few that the tail of the weights could not be judged.
func proposals(n int, efficiency float64) int {
	return max(n, fewestDraws) * int(min(max(math.Ceil(2/efficiency), 3), 10))
}

// final is a set of proposals from a frozen mixture with its weights.
type final struct {
	z     [][]float64
	logp  []float64
	w     []float64 // smoothed, summing to one
	lnZ   float64
	shape float64
}

func (t *target) propose(ctx context.Context, m *mixture, n int, s Stream) (*final, error) {
	f := &final{z: m.draw(n, s)}
	var err error
	if f.logp, err = t.evaluate(ctx, f.z); err != nil {
		return nil, err
	}
	lnW := m.lnDensity(f.z)
	for i := range lnW {
		lnW[i] = f.logp[i] - lnW[i]
	}
	f.shape = smooth(lnW)
	f.w, f.lnZ = normalised(lnW)
	return f, nil
}

func (f *final) efficiency() float64 { return kish(f.w) / float64(len(f.w)) }

func (f *final) passes() bool {
	return f.shape <= mostTailShape && f.efficiency() >= leastEfficient
}

// importanceSample turns proposals that pass into equally weighted draws.
func (t *target) importanceSample(f *final, n int, modes []mode, stream Stream) *Sample {
	picks, squares := resample(f.w, n, stream.Rand(0))
	s := t.physical(f.z, picks)
	s.Quality = Quality{
		Converged: true, Sampler: "importance", EffectiveDraws: effectiveDraws(f.z, f.w, squares), Evaluations: t.spent,
		Modes: settled(modes), LogEvidence: f.lnZ, EvidenceError: math.Sqrt(max(0, 1/kish(f.w)-1/float64(len(f.w)))), HasEvidence: true, PValue: 1,
	}
	if !math.IsInf(f.shape, 0) {
		s.Quality.TailShape = f.shape
	}
	return s
}

// physical maps the picked points from prior scores to parameter values.
func (t *target) physical(z [][]float64, picks []int) *Sample {
	s := &Sample{Values: rows(len(picks), t.dim), Best: t.best, BestLog: t.bestLog}
	for i, pick := range picks {
		for j, p := range t.free {
			s.Values[i][j] = p.Prior.FromScore(z[pick][j])
		}
	}
	return s
}

// startMixture proposes from every mode, half by its mass and half alike.
func startMixture(dim int, modes []mode) *mixture {
	var parts []part
	var shares []float64
	for _, m := range modes {
		parts = append(parts, newPart(m.z, m.factor, startDof))
		shares = append(shares, math.Exp(m.lnMass()-modes[0].lnMass())+1)
	}
	return newMixture(dim, defence, shares, parts)
}
