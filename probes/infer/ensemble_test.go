package infer

import (
	"context"
	"math"
	"strings"
	"testing"
)

// ensembleOf draws by the fallback alone.
func ensembleOf(t *testing.T, k known, workers int) *Sample {
	t.Helper()
	target, err := newTarget(k.problem, workers)
	if err != nil {
		t.Fatal(err)
	}
	ctx, stream := context.Background(), NewStream("ensemble")
	z, logp, err := survey(ctx, target, stream.Rand(0))
	if err != nil {
		t.Fatal(err)
	}
	modes, err := findModes(ctx, target, z, logp)
	if err != nil {
		t.Fatal(err)
	}
	s, err := target.ensembleSample(ctx, modes, 4000, stream)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func TestEnsembleIsRight(t *testing.T) {
	for _, k := range []known{gaussian(2, 0.1, 0.5), gaussian(5, 0.1, 0.9), edge(2, 0.05), cauchy(1, 50)} {
		s := ensembleOf(t, k, 2)
		q := s.Quality
		interval, _ := k.wrongness(s)
		t.Logf("%s: R̂ %.4f, %.0f effective of %d evaluations, worst percentile %.1f sd", k.name, q.RHat, q.EffectiveDraws, q.Evaluations, interval)
		if !q.Converged || q.Sampler != "ensemble" {
			t.Errorf("%s: %+v %v", k.name, q, s.Warnings)
		}
		if q.HasEvidence || q.LogEvidence != 0 {
			t.Errorf("%s: an ensemble claims an evidence", k.name)
		}
		if interval > 5 {
			t.Errorf("%s: a percentile is %.1f standard deviations off", k.name, interval)
		}
	}
}

// Walkers cannot pass between modes 40 standard deviations apart in four
// dimensions. They keep the shares they began with, in every ensemble alike, so
// R̂ between ensembles is content; the walkers' own chains tell.
func TestEnsembleStuckInModesSaysSo(t *testing.T) {
	s := ensembleOf(t, severalModes(4, 0.3, 40, 0.1, 0.9), 2)
	if s.Quality.Converged {
		t.Errorf("converged: %+v", s.Quality)
	}
	if len(s.Warnings) == 0 || !strings.Contains(s.Warnings[0], "have not converged") {
		t.Errorf("warnings: %q", s.Warnings)
	}
	if s.Quality.EffectiveDraws > 400 {
		t.Errorf("%.0f effective draws of walkers that do not mix", s.Quality.EffectiveDraws)
	}
}

// Importance sampling that cannot settle falls back and says so. A thin shell
// in four dimensions defeats any few t distributions.
func TestFallback(t *testing.T) {
	const dim, radius, width = 4, 20.0, 0.1
	k := flat(dim)
	for j := range k.problem.Free {
		k.problem.Free[j].Prior = uniform40
	}
	k.problem.Likelihood = plain(func(x []float64) float64 {
		sum := 0.0
		for _, v := range x {
			sum += v * v
		}
		return lnNormal(math.Sqrt(sum)-radius, width)
	})
	s, err := DrawPosterior(context.Background(), k.problem, Options{Workers: 2, Draws: 1000})
	if err != nil {
		t.Fatal(err)
	}
	q := s.Quality
	t.Logf("%+v %q", q, s.Warnings)
	if q.Sampler != "ensemble" || q.HasEvidence {
		t.Fatalf("the test no longer reaches the fallback: %+v", q)
	}
	if len(s.Warnings) == 0 || !strings.Contains(s.Warnings[0], "importance sampling did not settle") {
		t.Errorf("the fallback is not mentioned: %q", s.Warnings)
	}
	if q.Converged {
		// By symmetry every coordinate has median zero.
		for j := range dim {
			below := 0.0
			for _, x := range s.Values {
				if x[j] < 0 {
					below++
				}
			}
			if pull := (below/1000 - 0.5) * 2 * math.Sqrt(q.EffectiveDraws); math.Abs(pull) > 5 {
				t.Errorf("x%d: the median is %.1f standard deviations off", j+1, pull)
			}
		}
	} else if len(s.Warnings) < 2 {
		t.Errorf("not converged, and not said: %q", s.Warnings)
	}
}
