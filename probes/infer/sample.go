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
	m, err := t.adapt(ctx, startMixture(t.dim, modes), &c, o.Stream.Sub("adapt"))
	if err != nil {
		return nil, err
	}
	// Frozen from here.
	proposals := 3 * o.Draws
	z = m.draw(proposals, o.Stream.Sub("final"))
	if logp, err = t.evaluate(ctx, z); err != nil {
		return nil, err
	}
	lnW := m.lnDensity(z)
	for i := range lnW {
		lnW[i] = logp[i] - lnW[i]
	}
	shape := smooth(lnW)
	w, lnZ := normalised(lnW)
	if math.IsInf(lnZ, -1) {
		return nil, fmt.Errorf("infer: none of %d proposals is a possible model", proposals)
	}
	picks, effective := resample(w, o.Draws, o.Stream.Sub("resample").Rand(0))
	s := &Sample{Values: rows(o.Draws, t.dim), Best: t.best, BestLog: t.bestLog}
	for i, pick := range picks {
		for j, f := range t.free {
			s.Values[i][j] = f.Prior.FromScore(z[pick][j])
		}
	}
	s.Quality = Quality{
		Converged: shape <= 0.7, Sampler: "importance", EffectiveDraws: effective, Evaluations: t.spent,
		Modes: len(modes), LogEvidence: lnZ, HasEvidence: true, PValue: 1,
	}
	if !math.IsInf(shape, 0) {
		s.Quality.TailShape = shape
	}
	if !s.Quality.Converged {
		s.Warnings = append(s.Warnings, fmt.Sprintf("the draws have not converged: the importance weights have a heavy tail (k = %.2f, above 0.7)", shape))
	}
	return s, nil
}

// startMixture proposes from every mode, half by its mass and half alike.
func startMixture(dim int, modes []mode) *mixture {
	var parts []part
	var shares []float64
	for _, m := range modes {
		parts = append(parts, part{mean: m.z, factor: m.factor})
		shares = append(shares, math.Exp(m.lnMass()-modes[0].lnMass())+1)
	}
	return newMixture(dim, 5, defence, shares, parts)
}
