package infer

import (
	"context"
	"errors"
	"math"
	"os"
	"strconv"
	"strings"
	"sync/atomic"
	"testing"

	"github.com/google/go-cmp/cmp"

	"steelyard/probes/prior"
)

// The same bits for any number of workers, on a posterior that uses every step.
func TestWorkersDoNotChangeTheDraws(t *testing.T) {
	for _, k := range []known{gaussian(3, 0.1, 0.5), severalModes(2, 1, 12, 0.1, 0.5, 0.4)} {
		var first *Sample
		for _, workers := range []int{1, 2, 5} {
			s, err := DrawPosterior(context.Background(), k.problem, Options{Draws: 700, Workers: workers, Stream: NewStream("same")})
			if err != nil {
				t.Fatal(err)
			}
			if first == nil {
				first = s
			} else if diff := cmp.Diff(first, s); diff != "" {
				t.Errorf("%s with %d workers differs:\n%.600s", k.name, workers, diff)
			}
		}
		other, err := DrawPosterior(context.Background(), k.problem, Options{Draws: 700, Stream: NewStream("other")})
		if err != nil {
			t.Fatal(err)
		}
		if cmp.Equal(first.Values, other.Values) {
			t.Errorf("%s: another stream gives the same draws", k.name)
		}
	}
}

func TestEnsembleDoesNotDependOnWorkers(t *testing.T) {
	k := gaussian(2, 0.1, 0.5)
	one, two := ensembleOf(t, k, 1), ensembleOf(t, k, 3)
	if diff := cmp.Diff(one, two); diff != "" {
		t.Errorf("three workers differ from one:\n%.600s", diff)
	}
}

func TestDrawsByDefault(t *testing.T) {
	s, err := DrawPosterior(context.Background(), gaussian(1, 0.1, 0).problem, Options{})
	if err != nil {
		t.Fatal(err)
	}
	if len(s.Values) != 4000 {
		t.Errorf("%d draws by default", len(s.Values))
	}
	// 0.7 is the datum: no visited point can be likelier, and the climbs and
	// 12 000 proposals of spread 0.1 come within a thousandth of it.
	if math.Abs(s.Best[0]-0.7) > 1e-3 || math.Abs(s.BestLog-lnNormal(0, 0.1)) > 1e-4 {
		t.Errorf("best fit %v with ln likelihood %g", s.Best, s.BestLog)
	}
}

// problem1 has one uniform parameter and the given log likelihood.
func problem1(l func(x float64) float64) Problem {
	return Problem{
		Free:       []Free{{Name: "mass_200c", Unit: "solMass", Prior: must(prior.Uniform(1, 2))}},
		Likelihood: plain(func(x []float64) float64 { return l(x[0]) }),
	}
}

func TestBadLikelihoods(t *testing.T) {
	for _, c := range []struct {
		name string
		p    Problem
		o    Options
		says []string
	}{
		{"not a number", problem1(func(x float64) float64 {
			if x > 1.5 {
				return math.NaN()
			}
			return 0
		}), Options{}, []string{"NaN", "mass_200c = 1.", "solMass"}},
		{"infinite", problem1(func(float64) float64 { return math.Inf(1) }), Options{}, []string{"+Inf", "mass_200c = 1."}},
		{"panics", problem1(func(float64) float64 { panic("no such radius") }), Options{Workers: 2}, []string{"no such radius", "mass_200c = 1."}},
		{"impossible", problem1(func(float64) float64 { return math.Inf(-1) }), Options{}, []string{"the prior excludes the data", "mass_200c ~ uniform(1, 2)"}},
		{"cannot start", Problem{Free: problem1(nil).Free, Likelihood: func() func([]float64) float64 { panic("no data") }}, Options{}, []string{"no data"}},
		{"nothing free", Problem{Likelihood: plain(func([]float64) float64 { return 0 })}, Options{}, []string{"no free parameter"}},
		{"exact", Problem{Free: []Free{{Name: "beta", Prior: prior.Exact(1)}}, Likelihood: plain(func([]float64) float64 { return 0 })}, Options{}, []string{"beta is an exact number"}},
		{"fewer than no draws", problem1(func(float64) float64 { return 0 }), Options{Draws: -1}, []string{"-1 draws"}},
	} {
		_, err := DrawPosterior(context.Background(), c.p, c.o)
		if err == nil {
			t.Errorf("%s: no error", c.name)
			continue
		}
		for _, part := range c.says {
			if !strings.Contains(err.Error(), part) {
				t.Errorf("%s: %q does not say %q", c.name, err, part)
			}
		}
	}
}

// The error is the same one for any number of workers.
func TestErrorsDoNotDependOnWorkers(t *testing.T) {
	p := problem1(func(x float64) float64 {
		if x > 1.2 {
			return math.NaN()
		}
		return 0
	})
	var first string
	for _, workers := range []int{1, 2, 7} {
		_, err := DrawPosterior(context.Background(), p, Options{Workers: workers})
		if err == nil {
			t.Fatal("no error")
		}
		if first == "" {
			first = err.Error()
		}
		if err.Error() != first {
			t.Errorf("%d workers say %q, one says %q", workers, err, first)
		}
	}
}

func TestCancel(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	var calls atomic.Int64
	p := problem1(func(x float64) float64 {
		if calls.Add(1) == 300 {
			cancel()
		}
		return -x
	})
	if _, err := DrawPosterior(ctx, p, Options{Workers: 2}); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
	// What was in hand when it was cancelled: one chunk or one climb a worker.
	if n := calls.Load(); n > 1000 {
		t.Errorf("%d evaluations after cancelling at 300", n)
	}
}

// A likelihood that spoils its argument does not spoil the draws.
func TestLikelihoodMaySpoilItsArgument(t *testing.T) {
	honest := problem1(func(x float64) float64 { return lnNormal(x-1.5, 0.1) })
	rude := honest
	rude.Likelihood = plain(func(x []float64) float64 {
		l := lnNormal(x[0]-1.5, 0.1)
		x[0] = math.NaN()
		return l
	})
	a, err := DrawPosterior(context.Background(), honest, Options{Draws: 600})
	if err != nil {
		t.Fatal(err)
	}
	b, err := DrawPosterior(context.Background(), rude, Options{Draws: 600})
	if err != nil {
		t.Fatal(err)
	}
	if !cmp.Equal(a, b) {
		t.Error("the draws differ")
	}
}

// Simulation-based calibration (Talts et al. 2018): truth from the prior, data
// from the truth, and the rank of the truth among the draws. Three hundred
// problems of two parameters, of which one enters through a product, so that the
// posteriors are near Gaussian but not Gaussian. The ranks of 300 truths in ten
// bins have χ² with 9 degrees of freedom; 33.7 is its 1e-4 upper tail
// (scipy.stats.chi2.isf), so two parameters fail by chance once in 5000 seeds,
// and the seed is fixed.
func TestCalibration(t *testing.T) {
	const bins, draws = 10, 499
	problems := 300.0
	if os.Getenv("STEELYARD_SLOW") != "" {
		problems = 6000
	}
	a, b := must(prior.LogNormal(2, 0.5)), must(prior.Normal(1, 0.3))
	counts := [2][bins]float64{}
	within := [2]float64{}
	rng := NewStream("calibration truth").Rand(0)
	for i := range int(problems) {
		truth := [2]float64{a.FromScore(rng.NormFloat64()), b.FromScore(rng.NormFloat64())}
		y1, y2 := truth[0]*truth[1]+0.3*rng.NormFloat64(), truth[0]+0.4*rng.NormFloat64()
		p := Problem{Free: []Free{{Name: "a", Prior: a}, {Name: "b", Prior: b}}, Likelihood: plain(func(x []float64) float64 {
			return lnNormal(y1-x[0]*x[1], 0.3) + lnNormal(y2-x[0], 0.4)
		})}
		s, err := DrawPosterior(context.Background(), p, Options{Draws: draws, Stream: NewStream("calibration", strconv.Itoa(i))})
		if err != nil {
			t.Fatal(err)
		}
		if !s.Quality.Converged {
			t.Errorf("problem %d has not converged: %v", i, s.Warnings)
		}
		for j := range truth {
			rank := 0
			for _, x := range s.Values {
				if x[j] < truth[j] {
					rank++
				}
			}
			counts[j][rank*bins/(draws+1)]++
			if rank >= 80 && rank < 420 { // 340 of the 500 possible ranks
				within[j]++
			}
		}
	}
	for j := range counts {
		chi2 := 0.0
		for _, c := range counts[j] {
			chi2 += (c - problems/bins) * (c - problems/bins) / (problems / bins)
		}
		t.Logf("parameter %d: χ² of ranks %.1f for 9, 68%% intervals hold %.3f", j, chi2, within[j]/problems)
		if chi2 > 33.7 {
			t.Errorf("parameter %d: the ranks are not uniform: %v", j, counts[j])
		}
	}
}
