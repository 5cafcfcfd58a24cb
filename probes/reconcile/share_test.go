package reconcile

import (
	"context"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"steelyard/probes/infer"
)

// The five cases of shared nuisances. The last is a non-thermal pressure
// fraction, uniform from 0 to 0.4, of which both masses are 1/(1 − f): there the
// masses are not linear in the score, and a copula of normals would be wrong.
func TestSharedNuisancesAgainstBruteForce(t *testing.T) {
	thermal := func(s []float64) float64 { return -math.Log(1 - 0.4*normalBelow(s[0])) }
	for _, c := range []struct {
		name   string
		all    []string
		models []model
	}{
		{"constrained by no probe", []string{"a"}, []model{
			{names: []string{"a"}, noise: 0.05, effect: linear(0.1)},
			{names: []string{"a"}, noise: 0.08, effect: linear(-0.06)},
		}},
		{"constrained by one probe", []string{"a"}, []model{
			{names: []string{"a"}, noise: 0.05, effect: linear(0.1), weights: []float64{1}, value: 0.8, err: 0.7},
			{names: []string{"a"}, noise: 0.08, effect: linear(0.12)},
		}},
		{"two named by both", []string{"a", "b"}, []model{
			{names: []string{"a", "b"}, noise: 0.05, effect: linear(0.1, 0.07), weights: []float64{1, 1}, value: 0.5, err: 0.6},
			{names: []string{"a", "b"}, noise: 0.06, effect: linear(0.08, -0.1), weights: []float64{1, -0.5}, value: -0.4, err: 0.9},
		}},
		{"two, of which one estimate names one", []string{"a", "b"}, []model{
			{names: []string{"a", "b"}, noise: 0.05, effect: linear(0.1, 0.07), weights: []float64{1, 1}, value: 0.7, err: 0.6},
			{names: []string{"a"}, noise: 0.06, effect: linear(0.09), weights: []float64{1}, value: -0.3, err: 1},
		}},
		{"non-thermal fraction", []string{"f"}, []model{
			{names: []string{"f"}, noise: 0.04, effect: thermal},
			{names: []string{"f"}, noise: 0.05, effect: thermal, weights: []float64{1}, value: 0.6, err: 1},
		}},
	} {
		mean, sd, correlation := truth(c.models, c.all)
		const n = 20000
		rng := rand.New(rand.NewPCG(5, 5))
		estimates := []Estimate{
			{Name: "one", Block: "one", Draws: c.models[0].draws(rng, n)},
			{Name: "two", Block: "two", Draws: c.models[1].draws(rng, n)},
		}
		joint, err := Share(context.Background(), estimates, infer.NewStream(c.name))
		if err != nil {
			t.Fatalf("%s: %v", c.name, err)
		}
		if joint.Sampled {
			t.Errorf("%s: nothing here asks for sampling: %q", c.name, joint.Warnings)
		}
		got := readAt(t, joint, estimates, 1000)
		for k := range got {
			m, s := meanSD(got[k])
			// Means and spreads within 2% of the spread; 20000 draws know a mean to
			// 0.7% of it and a spread to 0.5%.
			if math.Abs(m-mean[k]) > 0.02*sd[k] || math.Abs(s-sd[k]) > 0.02*sd[k] {
				t.Errorf("%s, estimate %d: %.4f ± %.4f, by brute force %.4f ± %.4f", c.name, k+1, m, s, mean[k], sd[k])
			}
		}
		mx, sx := meanSD(got[0])
		my, sy := meanSD(got[1])
		r := 0.0
		for i := range got[0] {
			r += (got[0][i] - mx) * (got[1][i] - my) / (sx * sy) / n
		}
		if math.Abs(r-correlation) > 0.02 {
			t.Errorf("%s: correlation %.3f, by brute force %.3f", c.name, r, correlation)
		}
	}
}

// A shared error cancels in the ratio of two masses that feel it alike: 0.3 in
// ln M of both leaves their difference at its own noise.
func TestSharedErrorCancels(t *testing.T) {
	rng := rand.New(rand.NewPCG(6, 6))
	both := model{names: []string{"a"}, noise: 0.05, effect: linear(0.3)}
	low := both
	low.level = -0.25
	estimates := []Estimate{{Name: "one", Block: "one", Draws: both.draws(rng, 4000)}, {Name: "two", Block: "two", Draws: low.draws(rng, 4000)}}
	m := matchEstimates(t, Setup{Estimates: estimates, Places: []At{{Radius: 1000}}})
	r, err := Compare(m, Limits, infer.NewStream("cancel"))
	if err != nil {
		t.Fatal(err)
	}
	// 0.25/(0.05·√2) = 3.54σ; 4000 draws scatter it by 0.06.
	if got := r.Tensions[0].Sigma; math.Abs(got-3.54) > 0.18 {
		t.Errorf("%.2fσ, want 3.54σ", got)
	}
	if apart := r.Consistency[0].Sigma; math.Abs(apart-r.Tensions[0].Sigma) > 1e-12 {
		t.Errorf("the agreement of two, %.3fσ, is not their tension, %.3fσ", apart, r.Tensions[0].Sigma)
	}
}

// readAt is ln M(<r) of every estimate in the joint draws.
func readAt(t *testing.T, joint *Joint, estimates []Estimate, r float64) [][]float64 {
	t.Helper()
	var out [][]float64
	for k, e := range estimates {
		c, err := joint.newCarrier(k, e)
		if err != nil {
			t.Fatal(err)
		}
		ln, _, err := c.at(r)
		if err != nil {
			t.Fatal(err)
		}
		out = append(out, ln)
	}
	return out
}

// A nuisance that only one estimate names changes nothing of it, and is said.
func TestUnsharedNuisanceIsLeftAlone(t *testing.T) {
	rng := rand.New(rand.NewPCG(8, 8))
	a := model{names: []string{"a"}, noise: 0.05, effect: linear(0.1)}.draws(rng, 1000)
	b := model{names: []string{"b"}, noise: 0.05, effect: linear(0.1)}.draws(rng, 1000)
	estimates := []Estimate{{Name: "a", Draws: a}, {Name: "b", Draws: b}}
	joint, err := Share(context.Background(), estimates, infer.NewStream("s"))
	if err != nil {
		t.Fatal(err)
	}
	if joint.Scores != nil || len(joint.Nuisances) > 0 {
		t.Error("a nuisance named once was shared")
	}
	if len(joint.Warnings) != 2 || !strings.Contains(joint.Warnings[0], "nuisance.a is named by one") {
		t.Errorf("warnings: %q", joint.Warnings)
	}
	stored, _ := a.LnMassesAt(math.Log(1000))
	m, s := meanSD(stored)
	if mj, sj := meanSD(readAt(t, joint, estimates, 1000)[0]); math.Abs(m-mj) > 1e-12 || math.Abs(s-sj) > 1e-12 {
		t.Error("the draws were changed")
	}
}

// A nuisance whose prior and data disagree is said to: a measurement 3.2 ± 0.5
// of a unit normal lies 3.2/√1.25 = 2.86σ from it.
func TestPriorAgainstData(t *testing.T) {
	rng := rand.New(rand.NewPCG(4, 8))
	far := model{names: []string{"a"}, noise: 0.05, effect: linear(0.1), weights: []float64{1}, value: 3.2, err: 0.5}
	loose := model{names: []string{"a"}, noise: 0.05, effect: linear(0.1)}
	joint, err := Share(context.Background(), []Estimate{{Name: "far", Draws: far.draws(rng, 4000)}, {Name: "loose", Draws: loose.draws(rng, 4000)}}, infer.NewStream("s"))
	if err != nil {
		t.Fatal(err)
	}
	if want := "far: its data and the prior of nuisance.a disagree by 2.9σ"; len(joint.Warnings) == 0 || joint.Warnings[0] != want {
		t.Errorf("warnings %q, want %q first", joint.Warnings, want)
	}
}

// What is handed from node to node is stored whole.
func TestJointAndMatchingRoundTrip(t *testing.T) {
	rng := rand.New(rand.NewPCG(9, 9))
	a := model{names: []string{"a"}, noise: 0.05, effect: linear(0.1)}
	s := Setup{
		Estimates: []Estimate{{Name: "one", Block: "x", Draws: a.draws(rng, 60)}, {Name: "two", Block: "y", Draws: a.draws(rng, 60)}},
		Places:    []At{{Radius: 1000}, {Radius: 700}},
	}
	joint, err := Share(context.Background(), s.Estimates, infer.NewStream("r"))
	if err != nil {
		t.Fatal(err)
	}
	m := matchEstimates(t, s)
	m.Combined = []CombinedProfile{{Scattered: true, Own: []OwnMass{{Radius: Interval{1, 2, 3}}}}}
	roundTrip(t, joint, new(Joint))
	roundTrip(t, m, new(Matching))
}

type stored interface {
	MarshalBinary() ([]byte, error)
	UnmarshalBinary([]byte) error
}

func roundTrip(t *testing.T, v, back stored) {
	t.Helper()
	b, err := v.MarshalBinary()
	if err != nil {
		t.Fatal(err)
	}
	if err := back.UnmarshalBinary(b); err != nil {
		t.Fatal(err)
	}
	again, err := back.MarshalBinary()
	if err != nil || string(again) != string(b) {
		t.Errorf("%T does not survive storage (%v)", v, err)
	}
	for n := range b {
		if back.UnmarshalBinary(b[:n]) == nil {
			t.Fatalf("%T: %d of %d bytes were accepted", v, n, len(b))
		}
	}
}
