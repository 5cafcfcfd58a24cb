package reconcile

import (
	"context"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"steelyard/probes/infer"
)

// Where the normal law of the shared scores fails they are sampled jointly: a
// posterior that is skew, two that have two modes each (their covariances leave
// Λ negative), and two nuisances of which one is skew and known with the other.
func TestSampledNuisancesAgainstBruteForce(t *testing.T) {
	skew := func(s []float64) float64 { // a measurement of e^s
		u := (math.Exp(0.9*s[0]) - 0.5) / 0.35
		return -u * u / 2
	}
	modes := func(s []float64) float64 { // a measurement of s²
		u := (s[0]*s[0] - 4) / 1.2
		return -u * u / 2
	}
	tied := func(s []float64) float64 {
		u := (math.Exp(0.8*s[0]) + 0.6*s[1] - 0.8) / 0.4
		return -u * u / 2
	}
	for _, c := range []struct {
		name   string
		all    []string
		models []model
	}{
		{"skew", []string{"a"}, []model{
			{names: []string{"a"}, noise: 0.05, effect: linear(0.1), like: skew},
			{names: []string{"a"}, noise: 0.08, effect: linear(0.12), weights: []float64{1}, value: -0.2, err: 0.8},
		}},
		{"two modes", []string{"a"}, []model{
			{names: []string{"a"}, noise: 0.05, effect: linear(0.1), like: modes},
			{names: []string{"a"}, noise: 0.05, effect: linear(0.1), like: func(s []float64) float64 { return modes(s) - 0.1*(s[0]-2)*(s[0]-2) }},
		}},
		{"skew and tied to another", []string{"a", "b"}, []model{
			{names: []string{"a", "b"}, noise: 0.05, effect: linear(0.1, 0.05), like: tied},
			{names: []string{"b", "a"}, noise: 0.06, effect: linear(0.1, -0.07), weights: []float64{1, 0.5}, value: 0.5, err: 0.7},
		}},
	} {
		mean, sd, correlation := truth(c.models, c.all)
		const n = 20000
		rng := rand.New(rand.NewPCG(11, 5))
		estimates := []Estimate{
			{Name: "one", Block: "one", Draws: c.models[0].draws(rng, n)},
			{Name: "two", Block: "two", Draws: c.models[1].draws(rng, n)},
		}
		joint, err := Share(context.Background(), estimates, infer.NewStream(c.name))
		if err != nil {
			t.Fatalf("%s: %v", c.name, err)
		}
		if !joint.Sampled || !strings.Contains(strings.Join(joint.Warnings, " "), "sampled from all estimates jointly") {
			t.Errorf("%s: it was not sampled: %q", c.name, joint.Warnings)
		}
		got := readAt(t, joint, estimates, 1000)
		r := covarianceOf(got[0], got[1])
		for k := range got {
			m, s := meanSD(got[k])
			r /= s
			// Within 2% of the spread, as for the normal law.
			if math.Abs(m-mean[k]) > 0.02*sd[k] || math.Abs(s-sd[k]) > 0.02*sd[k] {
				t.Errorf("%s, estimate %d: %.4f ± %.4f, by brute force %.4f ± %.4f", c.name, k+1, m, s, mean[k], sd[k])
			}
		}
		if math.Abs(r-correlation) > 0.02 {
			t.Errorf("%s: correlation %.3f, by brute force %.3f", c.name, r, correlation)
		}
	}
}

// Two estimates that pull a nuisance to opposite sides, one of them with a skew
// likelihood: the draws of either hardly reach where both put it. Made again
// under the priors that Share asks for, they do.
func TestEstimatesMadeAgainWhereTheyMeet(t *testing.T) {
	skew := func(s []float64) float64 {
		u := (math.Exp(0.6*s[0]) - 0.35) / 0.2
		return -u * u / 2
	}
	models := []model{
		{names: []string{"a"}, noise: 0.05, effect: func(s []float64) float64 { return 0.1*s[0] + 0.03*s[0]*s[0] }, like: skew},
		{names: []string{"a"}, noise: 0.08, effect: linear(0.12), weights: []float64{1}, value: 1.3, err: 0.4},
	}
	mean, sd, _ := truth(models, []string{"a"})
	const n = 20000
	rng := rand.New(rand.NewPCG(12, 5))
	estimates := make([]Estimate, 2)
	for k, m := range models {
		estimates[k] = Estimate{Name: string(rune('p' + k)), Block: string(rune('p' + k)), Draws: m.draws(rng, n)}
	}
	joint, err := Share(context.Background(), estimates, infer.NewStream("first"))
	if err != nil {
		t.Fatal(err)
	}
	if len(joint.Tilts) != 2 || len(joint.Tilts[0]) != 1 {
		t.Fatalf("nothing was asked to be made again: %+v, %q", joint.Tilts, joint.Warnings)
	}
	again := joint
	for round := 1; again.Tilts != nil; round++ {
		if round > 2 {
			t.Fatalf("twice was not enough: %q", again.Warnings)
		}
		for k, m := range models {
			m.tilts = again.Tilts[k]
			estimates[k].Draws, estimates[k].Tilts = m.draws(rng, n), again.Tilts[k]
		}
		if again, err = Share(context.Background(), estimates, infer.NewStream("again")); err != nil {
			t.Fatal(err)
		}
	}
	for k, ln := range readAt(t, again, estimates, 1000) {
		if m, s := meanSD(ln); math.Abs(m-mean[k]) > 0.02*sd[k] || math.Abs(s-sd[k]) > 0.02*sd[k] {
			t.Errorf("estimate %d: %.4f ± %.4f, by brute force %.4f ± %.4f", k+1, m, s, mean[k], sd[k])
		}
	}
}
