package reconcile

import (
	"math"
	"math/rand/v2"
	"testing"

	"steelyard/probes/prior"
)

func must(p prior.Prior, err error) prior.Prior {
	if err != nil {
		panic(err)
	}
	return p
}

// The centre moves and the width stays, whatever the family.
func TestLeverMovesTheCentre(t *testing.T) {
	for _, c := range []struct {
		prior prior.Prior
		to    float64
		want  prior.Prior
		sd    float64
	}{
		{must(prior.Normal(1, 0.04)), 1.12, must(prior.Normal(1.12, 0.04)), 3},
		{must(prior.LogNormal(1, 0.1)), math.Exp(0.2), must(prior.LogNormal(math.Exp(0.2), 0.1)), 2},
		{must(prior.Uniform(-0.5, 0.5)), 0.25, must(prior.Uniform(-0.25, 0.75)), 0.25 * math.Sqrt(12)},
		{must(prior.LogUniform(1, 100)), 20, must(prior.LogUniform(2, 200)), math.Ln2 * math.Sqrt(12) / math.Log(100)},
	} {
		l := Lever{Prior: c.prior}
		got, err := l.Moved(c.to)
		if err != nil {
			t.Fatal(err)
		}
		if got.Kind != c.want.Kind || math.Abs(got.A/c.want.A-1) > 1e-12 || math.Abs(got.B/c.want.B-1) > 1e-12 {
			t.Errorf("%s moved to %g is %s, want %s", c.prior, c.to, got, c.want)
		}
		if sd, ok := l.InPriorSD(c.to); !ok || math.Abs(sd-c.sd) > 1e-12 {
			t.Errorf("%s to %g: %g prior sd, want %g", c.prior, c.to, sd, c.sd)
		}
	}
	half := Lever{Prior: must(prior.HalfNormal(0.05))}
	moved, err := half.Moved(0.2)
	if err != nil || math.Abs(moved.Mean()-0.2) > 1e-12 || math.Abs(moved.SD()-half.Prior.SD()) > 1e-12 {
		t.Errorf("a half normal moved to 0.2 is %s (%v), of mean %g and sd %g", moved, err, moved.Mean(), moved.SD())
	}
	if _, ok := (Lever{Prior: prior.Exact(0)}).InPriorSD(0.2); ok {
		t.Error("an exact number has a prior sd")
	}
}

// A disagreement that answers to its assumption in proportion is brought to one
// sigma at the first try where it was drawn, at the second where it was exact.
func TestLeverFindsItsValue(t *testing.T) {
	const apart, sd = 0.4, 0.1 // of ln ratio: 4σ
	needed := -(apart - sd)
	scale := Lever{Prior: must(prior.Normal(1, 0.04)), Low: 0.2, High: 5}
	center, cannot := scale.First(needed, -1.2)
	if cannot != "" || math.Abs(center-1.25) > 1e-12 {
		t.Errorf("the first centre is %g (%s), want 1 + 0.3/1.2 = 1.25", center, cannot)
	}
	if _, cannot := scale.First(needed, -0.1); cannot == "" {
		t.Error("75 standard deviations of the prior were allowed")
	}
	fraction := Lever{Prior: prior.Exact(0), Low: 0, High: 0.95}
	sigma := func(f float64) Trial { // ln 1/(1−f) brings b up
		pull := (apart + math.Log1p(-f)) / sd
		return Trial{f, pull, pull}
	}
	center, cannot = fraction.First(needed, 0)
	if cannot != "" || !(center > 0) {
		t.Fatalf("the first centre is %g (%s)", center, cannot)
	}
	trials := []Trial{sigma(0), sigma(center)}
	if center, cannot = fraction.Next(trials); cannot != "" {
		t.Fatal(cannot)
	}
	trials = append(trials, sigma(center))
	// The line through two points of ln(1−f) misses one sigma by half the square
	// of the fraction, in units of sd, at most.
	if got := trials[2].Sigma; math.Abs(got-1) > 0.5 {
		t.Errorf("the second trial, f = %.3f, is at %.2fσ", center, got)
	}
	center, _ = fraction.Next(trials)
	if want := -math.Expm1(needed); math.Abs(center-want) > 0.01 {
		t.Errorf("f = %.4f, want 1 − e^−0.3 = %.4f", center, want)
	}
	idle := Lever{Prior: prior.Exact(0), Low: 0, High: 1}
	if _, cannot := idle.Next([]Trial{{0, 4, 4}, {0.5, 4.01, 4.01}}); cannot == "" {
		t.Error("an assumption that does nothing was said to do")
	}
}

// The slope from reweighted draws is exact for normal ones: measuring M with a
// nuisance of unit prior that the data hold to v moves ln M by load·v/1 a prior sd.
func TestSlopeByReweighting(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 14))
	m := model{names: []string{"a"}, noise: 0.05, effect: linear(0.2), weights: []float64{1}, value: 0.4, err: 0.8}
	d := m.draws(rng, 20000)
	ln, _ := d.LnMassesAt(math.Log(1000))
	v := 0.64 / 1.64 // variance of the posterior of the nuisance
	if got, want := Slope(ln, d.Nuisances[0].Values), 0.2*v; math.Abs(got-want) > 0.002 {
		t.Errorf("slope %.4f, want %.4f", got, want)
	}
}
