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
		u := (math.Exp(s[0]) + 0.6*s[1] - 0.8) / 0.4
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
		got := average(t, func(t *testing.T, seed uint64) joined {
			rng := rand.New(rand.NewPCG(seed, 5))
			estimates := []Estimate{
				{Name: "one", Block: "one", Draws: c.models[0].draws(rng, few)},
				{Name: "two", Block: "two", Draws: c.models[1].draws(rng, few)},
			}
			joint, err := Share(context.Background(), estimates, infer.NewStream(c.name))
			if err != nil {
				t.Fatalf("%s: %v", c.name, err)
			}
			if !joint.Sampled || !strings.Contains(strings.Join(joint.Warnings, " "), "sampled from all estimates jointly") {
				t.Errorf("%s: it was not sampled: %q", c.name, joint.Warnings)
			}
			return join(readAt(t, joint, estimates, 1000))
		})
		checkJoined(t, c.name, got, c.models, c.all)
	}
}

// few draws a run, as many as an estimate has, and repeats of it: what a run
// scatters by, up to 3% of a spread, is not what is asked; the average of twelve
// scatters by a third of that.
const (
	few     = 4000
	repeats = 12
)

// joined is what is known of two masses that share a nuisance.
type joined struct {
	mean, sd    [2]float64
	correlation float64
}

func join(ln [][]float64) joined {
	var j joined
	for k := range ln {
		j.mean[k], j.sd[k] = meanSD(ln[k])
	}
	j.correlation = covarianceOf(ln[0], ln[1]) / (j.sd[0] * j.sd[1])
	return j
}

func average(t *testing.T, run func(*testing.T, uint64) joined) joined {
	t.Helper()
	var sum joined
	for seed := range uint64(repeats) {
		j := run(t, seed)
		for k := range j.mean {
			sum.mean[k] += j.mean[k] / repeats
			sum.sd[k] += j.sd[k] / repeats
		}
		sum.correlation += j.correlation / repeats
	}
	return sum
}

// checkJoined asks for what brute force gives, within 2% of the spread.
func checkJoined(t *testing.T, name string, got joined, models []model, all []string) {
	t.Helper()
	mean, sd, correlation := truth(models, all)
	for k := range mean {
		if math.Abs(got.mean[k]-mean[k]) > 0.02*sd[k] || math.Abs(got.sd[k]-sd[k]) > 0.02*sd[k] {
			t.Errorf("%s, estimate %d: %.4f ± %.4f, by brute force %.4f ± %.4f", name, k+1, got.mean[k], got.sd[k], mean[k], sd[k])
		}
	}
	if math.Abs(got.correlation-correlation) > 0.02 {
		t.Errorf("%s: correlation %.3f, by brute force %.3f", name, got.correlation, correlation)
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
	got := average(t, func(t *testing.T, seed uint64) joined {
		rng := rand.New(rand.NewPCG(seed, 6))
		estimates := make([]Estimate, 2)
		for k, m := range models {
			estimates[k] = named(string(rune('p'+k)), m.draws(rng, few))
		}
		joint, err := Share(context.Background(), estimates, infer.NewStream("first"))
		if err != nil {
			t.Fatal(err)
		}
		if len(joint.Tilts) != 2 || len(joint.Tilts[0]) != 1 {
			t.Fatalf("nothing was asked to be made again: %+v, %q", joint.Tilts, joint.Warnings)
		}
		for round := 1; joint.Tilts != nil; round++ {
			if round > 2 {
				t.Fatalf("twice was not enough: %q", joint.Warnings)
			}
			for k, m := range models {
				m.tilts = joint.Tilts[k]
				estimates[k].Draws, estimates[k].Tilts = m.draws(rng, few), joint.Tilts[k]
			}
			if joint, err = Share(context.Background(), estimates, infer.NewStream("again")); err != nil {
				t.Fatal(err)
			}
		}
		return join(readAt(t, joint, estimates, 1000))
	})
	checkJoined(t, "made again", got, models, []string{"a"})
}
