package dynamics

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"sort"
	"sync"

	"steelyard/probes/constants"
	"steelyard/probes/estimate"
	"steelyard/probes/infer"
)

// sample is the members whose velocities one estimate uses, by rising velocity,
// and their dispersion.
type sample struct {
	galaxies   []Galaxy
	velocities []float64 // of galaxies, km/s
	scale      scale
	observed   float64 // dispersion as observed, km/s
	noise      float64 // rms of the redshift errors in the cluster's frame, km/s
	rejected   int     // galaxies in the same radii that are not members
	list       *Members
}

// readSample reads the members between the radii of `fit_within`, all by
// default, and measures their dispersion.
func readSample(t *estimate.Task) (*sample, error) {
	list := &Members{}
	if err := list.UnmarshalBinary(t.Reduced["members"]); err != nil {
		return nil, t.Errorf("%w", err)
	}
	from, to := 0.0, math.Inf(1)
	if v := t.Settings["fit_within"]; v.Set {
		from, to = kpc(t, v.Numbers[0], v.Unit), kpc(t, v.Numbers[1], v.Unit)
	}
	s := &sample{list: list}
	s.galaxies, s.rejected = list.used(from, to)
	if len(s.galaxies) < fewest {
		return nil, t.Errorf("%s: %d members between %.0f and %.0f kpc are too few; a dispersion needs at least %d",
			list.File, len(s.galaxies), from, to, fewest)
	}
	sort.SliceStable(s.galaxies, func(a, b int) bool { return s.galaxies[a].Velocity < s.galaxies[b].Velocity })
	s.velocities = make([]float64, len(s.galaxies))
	for i, g := range s.galaxies {
		s.velocities[i] = g.Velocity
		e := constants.SpeedOfLight * g.Error / (1 + list.Redshift)
		s.noise += e * e
	}
	s.noise = math.Sqrt(s.noise / float64(len(s.galaxies)))
	s.scale = scaleNamed(t.Settings["dispersion"].Text, len(s.galaxies))
	s.observed = s.scale.of(s.velocities, nil)
	if !(s.observed > 0) {
		return nil, t.Errorf("%s: the members' velocities are all the same", list.File)
	}
	return s, nil
}

// intrinsic removes the redshift errors in quadrature, σ² − ⟨δ²⟩/(1+z̄)²
// (Danese, De Zotti & di Tullio 1980); NaN when they exceed the dispersion.
func (s *sample) intrinsic(observed float64) float64 {
	return math.Sqrt(observed*observed - s.noise*s.noise)
}

// farthest is the projected radius of the outermost galaxy, kpc.
func (s *sample) farthest() float64 {
	far := 0.0
	for _, g := range s.galaxies {
		far = max(far, g.Radius)
	}
	return far
}

// resamples are draws of the dispersion by bootstrap, and of quantities that
// are linear in how often each galaxy counts.
type resamples struct {
	sigma  []float64 // km/s, redshift errors removed
	linear []float64 // Σ (n_i − 1) ψ_i of the same resample; nil without ψ
	// unresolved is the share of resamples whose dispersion was not above the
	// redshift errors; they were drawn again.
	unresolved float64
}

// bootstrap draws the dispersion n times. With σ̂ the estimate, and σ* that of a
// resample of the galaxies with replacement, a draw is
//
//	ln σ = 2 ln σ̂ − ln σ*,
//
// so that the scatter of ln σ* about ln σ̂ stands for that of ln σ̂ about the
// truth (the pivotal bootstrap in the logarithm; Davison & Hinkley 1997,
// section 5.2). For normal velocities this is the posterior of σ under a prior
// flat in ln σ. psi, one value a galaxy, may be nil.
func (s *sample) bootstrap(ctx context.Context, t *estimate.Task, n int, psi []float64) (resamples, error) {
	const chunk = 64
	const tries = 200
	size := len(s.galaxies)
	centre := s.observed * s.scale.shrink(float64(size)) * s.observed
	out := resamples{sigma: make([]float64, n)}
	if psi != nil {
		out.linear = make([]float64, n)
	}
	stream := t.Sampling.Stream.Sub("bootstrap")
	failures := make([]int, (n+chunk-1)/chunk)
	err := inChunks(ctx, n, chunk, t.Sampling.Workers, func(c, from, to int) {
		rng := stream.Rand(c)
		counts := make([]int, size)
		for i := from; i < to; i++ {
			for try := 0; ; try++ {
				resample(rng, counts)
				out.sigma[i] = s.intrinsic(centre / s.scale.of(s.velocities, counts))
				if out.sigma[i] > 0 || try == tries {
					break
				}
				failures[c]++
			}
			for k, p := range psi {
				out.linear[i] += float64(counts[k]-1) * p
			}
		}
	})
	if err != nil {
		return resamples{}, err
	}
	failed := 0
	for _, f := range failures {
		failed += f
	}
	out.unresolved = float64(failed) / float64(failed+n)
	for _, sigma := range out.sigma {
		if !(sigma > 0) || math.IsInf(sigma, 0) {
			return resamples{}, t.Errorf("the redshift errors (%.0f km/s) exceed the dispersion (%.0f km/s from %d galaxies): the motions of the galaxies are not resolved",
				s.noise, s.observed, size)
		}
	}
	return out, nil
}

// resample fills counts with how often each galaxy is drawn when as many are
// drawn with replacement.
func resample(rng *rand.Rand, counts []int) {
	clear(counts)
	for range counts {
		counts[rng.IntN(len(counts))]++
	}
}

// inChunks calls f for each chunk of [0, n), on at most so many goroutines. What
// a chunk does must depend on its number alone.
func inChunks(ctx context.Context, n, size, workers int, f func(chunk, from, to int)) error {
	next := make(chan int)
	var done sync.WaitGroup
	for range max(1, workers) {
		done.Go(func() {
			for c := range next {
				f(c, c*size, min((c+1)*size, n))
			}
		})
	}
	for c := 0; c*size < n && ctx.Err() == nil; c++ {
		next <- c
	}
	close(next)
	done.Wait()
	return ctx.Err()
}

// describe says in words what the dispersion rests on.
func (s *sample) describe() []string {
	lines := append([]string(nil), s.list.Notes...)
	lines = append(lines, fmt.Sprintf("dispersion: %s of %d members out to %.0f kpc, %.0f km/s in the cluster's frame about z = %.5f; error by bootstrap",
		s.scale.name, len(s.galaxies), s.farthest(), s.observed, s.list.Redshift))
	if s.list.HasErrors {
		lines = append(lines, fmt.Sprintf("redshift errors of %.0f km/s removed in quadrature (Danese et al. 1980)", s.noise))
	} else {
		lines = append(lines, "redshift errors taken as zero, for the catalogue gives none")
	}
	return lines
}

// remarks warns of a dispersion that the redshift errors do not let be measured.
func (s *sample) remarks(r resamples) []string {
	warnings := append([]string(nil), s.list.Warnings...)
	if r.unresolved > 0.025 {
		warnings = append(warnings, fmt.Sprintf("the dispersion (%.0f km/s observed) is hardly above the redshift errors (%.0f km/s): read it and the mass as upper limits; σ < %.0f km/s at 95%%",
			s.observed, s.noise, infer.Percentiles(r.sigma, 95)[0]))
	}
	return warnings
}
