package infer

import (
	"context"
	"os"
	"strconv"
	"testing"
)

// posteriors are drawn from in every test run, with one seed each.
func posteriors() []known {
	return []known{
		gaussian(2, 0.1, 0), gaussian(4, 0.1, 0.9), gaussian(4, 0.01, 1000), gaussian(8, 0.1, 0.9),
		banana(1, 0.3), edge(1, 0.02), edge(3, 0.02), half(-3, 0.5), half(-1, 0.1),
		cauchy(1, 50), cauchy(1, 1e4), student(3),
		severalModes(4, 1, 12, 0.3, 0.7), severalModes(4, 0.1, 12, 0.3, 0.7), severalModes(2, 1, 12, 0.1, 0.5, 0.4),
		narrow(3), funnel(3, 1), ring(0.3), box(2, 0.2), flat(2),
	}
}

// morePosteriors take longer, or more evaluations than is reasonable.
func morePosteriors() []known {
	return []known{
		gaussian(1, 0.1, 0), gaussian(12, 0.3, 0.5), banana(3, 0.3), edge(2, 0.001), cauchy(2, 50),
		severalModes(1, 1, 6, 0.05, 0.95), narrow(1), narrow(6), funnel(3, 3), funnel(6, 3), ring(0.05), box(4, 0.1), flat(12),
	}
}

// Draws that call themselves converged must be right. The pulls are in units of
// what the draws' own effective number and the evidence's own error allow, some
// ten percentiles and one evidence a posterior: 5 standard deviations happen
// once in a million, so a failure is a wrong interval or a wrong evidence.
func check(t *testing.T, k known, seed int) (s *Sample) {
	t.Helper()
	s, err := DrawPosterior(context.Background(), k.problem, Options{Workers: 2, Stream: NewStream("posteriors", strconv.Itoa(seed))})
	if err != nil {
		t.Fatalf("%s: %v", k.name, err)
	}
	q := s.Quality
	interval, evidence := k.wrongness(s)
	t.Logf("%s: %s, converged %t, %d evaluations, %.0f effective, k = %.2f, worst percentile %.1f sd, ln evidence %.1f sd",
		k.name, q.Sampler, q.Converged, q.Evaluations, q.EffectiveDraws, q.TailShape, interval, evidence)
	if q.Converged && interval > 5 {
		t.Errorf("%s: converged, but a percentile is %.1f standard deviations off", k.name, interval)
	}
	if q.Converged && evidence > 5 {
		t.Errorf("%s: converged, but the evidence %.4f ± %.4f should be %.4f", k.name, q.LogEvidence, q.EvidenceError, k.lnZ)
	}
	if !q.Converged && len(s.Warnings) == 0 {
		t.Errorf("%s: not converged, and nothing said", k.name)
	}
	return s
}

// Not one of these may come back unconverged: they are what estimators meet.
func TestPosteriorsWithKnownAnswers(t *testing.T) {
	for _, k := range posteriors() {
		t.Run(k.name, func(t *testing.T) {
			if s := check(t, k, 1); !s.Quality.Converged {
				t.Errorf("not converged: %v", s.Warnings)
			}
		})
	}
}

// Twenty seeds of every posterior, some of which need the ensemble.
func TestManyPosteriors(t *testing.T) {
	if os.Getenv("STEELYARD_SLOW") == "" {
		t.Skip("some ten minutes of drawing; set STEELYARD_SLOW=1")
	}
	for _, k := range append(posteriors(), morePosteriors()...) {
		t.Run(k.name, func(t *testing.T) {
			for seed := range 20 {
				check(t, k, seed)
			}
		})
	}
}

// Two narrow modes 12 standard deviations apart in four dimensions: both are
// found, with the right weights, or the draws do not call themselves converged.
func TestTwoModesFarApart(t *testing.T) {
	k := severalModes(4, 0.1, 12, 0.3, 0.7)
	for seed := range 8 {
		s := check(t, k, 100+seed)
		if !s.Quality.Converged {
			continue
		}
		low := 0.0
		for _, x := range s.Values {
			if x[0] < 0 {
				low++
			}
		}
		if s.Quality.Modes != 2 {
			t.Errorf("seed %d: %d modes", seed, s.Quality.Modes)
		}
		share, sd := low/float64(len(s.Values)), 0.4583/64 // √(0.3·0.7) over √4096
		if share < 0.3-5*sd || share > 0.3+5*sd {
			t.Errorf("seed %d: the lesser mode holds %.3f of the draws, not 0.3", seed, share)
		}
	}
}

// BenchmarkDraw reports what is asked of the sampler: effective draws per
// likelihood evaluation, counting every evaluation, at 4000 draws.
func BenchmarkDraw(b *testing.B) {
	for _, k := range []known{gaussian(2, 0.1, 0), gaussian(3, 0.1, 0.9), gaussian(4, 0.1, 0.9), student(3), edge(3, 0.02), gaussian(8, 0.1, 0.9)} {
		b.Run(k.name, func(b *testing.B) {
			effective, spent := 0.0, 0.0
			for i := 0; i < b.N; i++ {
				s, err := DrawPosterior(context.Background(), k.problem, Options{Stream: NewStream("benchmark", strconv.Itoa(i))})
				if err != nil {
					b.Fatal(err)
				}
				effective += s.Quality.EffectiveDraws
				spent += float64(s.Quality.Evaluations)
			}
			b.ReportMetric(effective/spent, "effective/evaluation")
			b.ReportMetric(spent/float64(b.N), "evaluations/op")
		})
	}
}
