package infer

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
)

const (
	ensembles   = 4    // independent ones, for R̂
	firstSweeps = 400  // of every ensemble; the first half is forgotten
	mostSweeps  = 3200 // the number doubles up to this
	wantedRHat  = 1.01
	wantedESS   = 400 // a hundred for each ensemble (Vehtari et al. 2021)
)

// ensemble is a set of walkers that move by affine-invariant stretches (Goodman
// & Weare 2010). Its whole state is here, so it can be run further.
type ensemble struct {
	rng     *rand.Rand
	z       [][]float64
	logp    []float64
	history [][]float64 // history[j] is parameter j: all walkers after each sweep
}

// ensembleSample draws from the posterior by four ensembles, each with walkers
// about every mode, running them on until the diagnostics are content or the
// sweeps run out.
func (t *target) ensembleSample(ctx context.Context, modes []mode, n int, s Stream) (*Sample, error) {
	walkers := 2 * max(10, t.dim+2)
	runs := make([]*ensemble, ensembles)
	err := t.each(ctx, ensembles, func(w *worker, v *visit, e int) (err error) {
		runs[e], err = t.startEnsemble(w, v, modes, walkers, s.Sub("ensemble").Rand(e))
		return err
	})
	if err != nil {
		return nil, err
	}
	var v verdict
	for sweeps, more := firstSweeps, firstSweeps; ; sweeps, more = 2*sweeps, sweeps {
		err := t.each(ctx, ensembles, func(w *worker, v *visit, e int) error {
			return t.sweep(ctx, w, v, runs[e], more)
		})
		if err != nil {
			return nil, err
		}
		if v = judgeEnsembles(runs, t.dim, walkers, sweeps); v.content() || 2*sweeps > mostSweeps {
			return t.fromEnsembles(runs, v, modes, n, walkers, sweeps, s.Sub("thin").Rand(0)), nil
		}
	}
}

func (t *target) startEnsemble(w *worker, v *visit, modes []mode, walkers int, rng *rand.Rand) (*ensemble, error) {
	e := &ensemble{rng: rng, z: rows(walkers, t.dim), logp: make([]float64, walkers), history: make([][]float64, t.dim)}
	y := make([]float64, t.dim)
	for k := range walkers {
		m := modes[k%len(modes)]
		// Closer to the mode each time the model there is impossible.
		for scale := 1.5; ; scale /= 2 {
			for j := range y {
				y[j] = rng.NormFloat64()
			}
			unwhitened(e.z[k], m.factor, y, m.z, scale)
			var err error
			if e.logp[k], err = t.logPosterior(w, v, e.z[k]); err != nil {
				return nil, err
			}
			if !math.IsInf(e.logp[k], -1) || scale < 1e-6 {
				break
			}
		}
	}
	return e, nil
}

// sweep moves every walker the given number of times, half of them against the
// other half: walker x along the line to a walker y of the other half, to
// y + s (x − y), with s of density ∝ 1/√s between ½ and 2, accepted with
// probability s^(d−1) p(new)/p(old).
func (t *target) sweep(ctx context.Context, w *worker, v *visit, e *ensemble, sweeps int) error {
	half := len(e.z) / 2
	trial := make([]float64, t.dim)
	for range sweeps {
		if err := ctx.Err(); err != nil {
			return err
		}
		for k := range e.z {
			other := e.rng.IntN(half)
			if k < half {
				other += half
			}
			root := (1 + e.rng.Float64()) / math.Sqrt2
			s := root * root
			for j := range trial {
				trial[j] = e.z[other][j] + s*(e.z[k][j]-e.z[other][j])
			}
			logp, err := t.logPosterior(w, v, trial)
			if err != nil {
				return err
			}
			if math.Log(1-e.rng.Float64()) < float64(t.dim-1)*math.Log(s)+logp-e.logp[k] {
				copy(e.z[k], trial)
				e.logp[k] = logp
			}
		}
		for _, z := range e.z {
			for j, s := range z {
				e.history[j] = append(e.history[j], s)
			}
		}
	}
	return nil
}

// verdict is what the diagnostics say of the second half of the ensembles.
type verdict struct {
	rHat, bulk, tail float64
}

func (v verdict) content() bool {
	return v.rHat < wantedRHat && v.bulk >= wantedESS && v.tail >= wantedESS
}

// judgeEnsembles takes the worst parameter. R̂ compares the ensembles; the
// effective sizes take every walker for a chain, so that walkers stuck in
// different modes count for next to nothing even when all ensembles are stuck
// alike.
func judgeEnsembles(runs []*ensemble, dim, walkers, sweeps int) verdict {
	v := verdict{bulk: math.Inf(1), tail: math.Inf(1)}
	for j := range dim {
		var whole, single [][]float64
		for _, e := range runs {
			late := e.history[j][sweeps/2*walkers : sweeps*walkers]
			whole = append(whole, late)
			for k := range walkers {
				chain := make([]float64, len(late)/walkers)
				for i := range chain {
					chain[i] = late[i*walkers+k]
				}
				single = append(single, chain)
			}
		}
		v.rHat = max(v.rHat, rHat(whole))
		v.bulk = min(v.bulk, bulkESS(single))
		v.tail = min(v.tail, tailESS(single))
	}
	return v
}

// fromEnsembles picks n evenly spaced draws from the second half of all
// ensembles.
func (t *target) fromEnsembles(runs []*ensemble, v verdict, modes []mode, n, walkers, sweeps int, rng *rand.Rand) *Sample {
	perRun := (sweeps - sweeps/2) * walkers
	total := perRun * len(runs)
	z := make([][]float64, total)
	for i := range z {
		e, at := runs[i/perRun], sweeps/2*walkers+i%perRun
		z[i] = make([]float64, t.dim)
		for j := range z[i] {
			z[i][j] = e.history[j][at]
		}
	}
	even := make([]float64, total)
	for i := range even {
		even[i] = 1 / float64(total)
	}
	picks, _ := resample(even, n, rng)
	s := t.physical(z, picks)
	// The draws' own scatter about the chains adds to that of the chains.
	inverse := 1/min(v.bulk, v.tail) + max(0, 1/float64(n)-1/float64(total))
	s.Quality = Quality{
		Converged: v.content(), Sampler: "ensemble", EffectiveDraws: 1 / inverse,
		Evaluations: t.spent, Modes: settled(modes), RHat: v.rHat, PValue: 1,
	}
	if !v.content() {
		s.Warnings = append(s.Warnings, fmt.Sprintf(
			"the draws have not converged: after %d evaluations split R̂ is %.3f (wanted: below %g) and the effective number of draws %.0f (wanted: %d); masses and errors of this estimate are not to be trusted",
			t.spent, v.rHat, wantedRHat, min(v.bulk, v.tail), wantedESS))
	}
	return s
}
