package reconcile

import (
	"math"
	"math/rand/v2"
	"testing"

	"steelyard/probes/infer"
)

// model is an estimate whose posterior is known: ln M = level + effect(s) +
// noise, its data adding to the prior N(0,1) of each score s a measurement of
// (weights·s) with the given error (0 for none).
type model struct {
	names   []string
	level   float64
	noise   float64
	effect  func(s []float64) float64
	weights []float64
	value   float64
	err     float64
}

func (m model) logLikelihood(s []float64) float64 {
	if m.err == 0 {
		return 0
	}
	sum := 0.0
	for j, w := range m.weights {
		sum += w * s[j]
	}
	u := (sum - m.value) / m.err
	return -u * u / 2
}

// draws samples the posterior of the estimate alone by rejection.
func (m model) draws(rng *rand.Rand, n int) *infer.Draws {
	d := &infer.Draws{N: n, Radii: []float64{500, 1000, 2000}, Covers: [2]float64{500, 2000}}
	columns := make([][]float64, len(m.names))
	for d.LnMass == nil || len(d.LnMass) < 3*n {
		s := normals(rng, len(m.names))
		if rng.Float64() > math.Exp(m.logLikelihood(s)) {
			continue
		}
		for j := range s {
			columns[j] = append(columns[j], s[j])
		}
		ln := m.level + m.effect(s) + m.noise*rng.NormFloat64()
		d.LnMass = append(d.LnMass, ln-0.5, ln, ln+0.5)
	}
	for j, name := range m.names {
		d.Nuisances = append(d.Nuisances, infer.Parameter{Name: name, Values: columns[j]})
	}
	return d
}

// truth is the mean and covariance of both ln M with the nuisances shared, by
// weighting a million joint draws of the prior: brute force.
func truth(models []model, all []string) (mean, sd []float64, correlation float64) {
	rng := rand.New(rand.NewPCG(99, 1))
	var w, wx, wy, wxx, wyy, wxy float64
	for range 1_000_000 {
		s := normals(rng, len(all))
		ln, weight := make([]float64, 2), 0.0
		for k, m := range models {
			own := make([]float64, len(m.names))
			for j, name := range m.names {
				for i, a := range all {
					if a == name {
						own[j] = s[i]
					}
				}
			}
			weight += m.logLikelihood(own)
			ln[k] = m.level + m.effect(own)
		}
		p := math.Exp(weight)
		w, wx, wy = w+p, wx+p*ln[0], wy+p*ln[1]
		wxx, wyy, wxy = wxx+p*ln[0]*ln[0], wyy+p*ln[1]*ln[1], wxy+p*ln[0]*ln[1]
	}
	mx, my := wx/w, wy/w
	vx, vy := wxx/w-mx*mx+models[0].noise*models[0].noise, wyy/w-my*my+models[1].noise*models[1].noise
	return []float64{mx, my}, []float64{math.Sqrt(vx), math.Sqrt(vy)}, (wxy/w - mx*my) / math.Sqrt(vx*vy)
}

func linear(a ...float64) func([]float64) float64 {
	return func(s []float64) float64 {
		sum := 0.0
		for j, c := range a {
			sum += c * s[j]
		}
		return sum
	}
}

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
		joint, err := Transport(estimates, infer.NewStream(c.name))
		if err != nil {
			t.Fatalf("%s: %v", c.name, err)
		}
		got := make([][]float64, 2)
		for k, d := range joint.Profiles {
			for i := range d.N {
				got[k] = append(got[k], d.LnMass[i*3+1])
			}
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
	m, err := MatchAll(estimates, []At{{Radius: 1000}}, "", Background{}, infer.NewStream("cancel"))
	if err != nil {
		t.Fatal(err)
	}
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

// A posterior that is skew in the score is said to be.
func TestSkewNuisanceIsDoubted(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 7))
	skew := model{names: []string{"a"}, noise: 0.05, effect: linear(0.1)}
	d := skew.draws(rng, 4000)
	for i, s := range d.Nuisances[0].Values {
		d.Nuisances[0].Values[i] = s + 0.4*(s*s-1)
	}
	joint, err := Transport([]Estimate{{Name: "skewed", Draws: d}, {Name: "plain", Draws: skew.draws(rng, 4000)}}, infer.NewStream("s"))
	if err != nil {
		t.Fatal(err)
	}
	if len(joint.Warnings) != 1 {
		t.Errorf("warnings: %q", joint.Warnings)
	}
}

// A nuisance that only one estimate names changes nothing of it.
func TestUnsharedNuisanceIsLeftAlone(t *testing.T) {
	rng := rand.New(rand.NewPCG(8, 8))
	a := model{names: []string{"a"}, noise: 0.05, effect: linear(0.1)}.draws(rng, 1000)
	b := model{names: []string{"b"}, noise: 0.05, effect: linear(0.1)}.draws(rng, 1000)
	joint, err := Transport([]Estimate{{Name: "a", Draws: a}, {Name: "b", Draws: b}}, infer.NewStream("s"))
	if err != nil {
		t.Fatal(err)
	}
	if joint.Scores != nil || len(joint.Nuisances) > 0 {
		t.Error("a nuisance named once was shared")
	}
	m, s := meanSD(a.LnMass)
	if mj, sj := meanSD(joint.Profiles[0].LnMass); math.Abs(m-mj) > 1e-12 || math.Abs(s-sj) > 1e-12 {
		t.Error("the draws were changed")
	}
}

// Matchings are stored between two nodes.
func TestMatchingRoundTrip(t *testing.T) {
	rng := rand.New(rand.NewPCG(9, 9))
	a := model{names: []string{"a"}, noise: 0.05, effect: linear(0.1)}
	m, err := MatchAll([]Estimate{{Name: "one", Block: "x", Draws: a.draws(rng, 50)}, {Name: "two", Block: "y", Draws: a.draws(rng, 50)}}, []At{{Radius: 1000}, {Radius: 700}}, "", Background{}, infer.NewStream("r"))
	if err != nil {
		t.Fatal(err)
	}
	b, err := m.MarshalBinary()
	if err != nil {
		t.Fatal(err)
	}
	var back Matching
	if err := back.UnmarshalBinary(b); err != nil {
		t.Fatal(err)
	}
	again, err := back.MarshalBinary()
	if err != nil || string(again) != string(b) {
		t.Errorf("a matching does not survive storage (%v)", err)
	}
	for n := range b {
		if back.UnmarshalBinary(b[:n]) == nil {
			t.Fatalf("%d of %d bytes were accepted", n, len(b))
		}
	}
}
