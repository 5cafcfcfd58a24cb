package reconcile

import (
	"context"
	"math"
	"math/rand/v2"
	"os"
	"sort"
	"testing"

	"steelyard/probes/infer"
)

// sets is how many data sets a calibration invents: two thousand, or few when
// nobody asked for the slow tests.
func sets() int {
	if os.Getenv("STEELYARD_SLOW") != "" {
		return 2000
	}
	return 120
}

// survey invents the data of several estimates of one mass, ln M = 0: each
// measures ln M + load·z with an error of its own, z being a nuisance whose prior
// is the unit normal and which all that load it share.
type survey struct {
	sd, load, bias []float64
}

// invent draws one data set and the posterior of each estimate.
func (v survey) invent(rng *rand.Rand, draws int) []Estimate {
	z := rng.NormFloat64()
	var out []Estimate
	for k, sd := range v.sd {
		name := string(rune('a' + k))
		m := model{level: v.bias[k] + v.load[k]*z + sd*rng.NormFloat64(), noise: sd, effect: linear()}
		if v.load[k] != 0 {
			m.names, m.effect = []string{"z"}, linear(-v.load[k])
		}
		out = append(out, Estimate{Name: name, Block: name, Draws: m.draws(rng, draws)})
	}
	return out
}

// compare runs the whole comparison at one radius.
func (v survey) compare(t *testing.T, seed uint64, draws int) *Result {
	t.Helper()
	s := Setup{Estimates: v.invent(rand.New(rand.NewPCG(seed, 77)), draws), Places: []At{{Radius: 1000}}}
	joint, err := Share(context.Background(), s.Estimates, infer.NewStream("calibration"))
	if err != nil {
		t.Fatal(err)
	}
	m, err := MatchAll(s, joint, infer.NewStream("calibration"))
	if err != nil {
		t.Fatal(err)
	}
	r, err := Compare(m, Limits, infer.NewStream("calibration"))
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// Under agreement p must be uniform, of a pair and of all, whether the estimates
// are independent or share a nuisance. Each set has its own data.
func TestPIsUniformUnderAgreement(t *testing.T) {
	none := []float64{0, 0, 0, 0}
	for _, c := range []struct {
		name   string
		survey survey
	}{
		{"two", survey{[]float64{0.1, 0.2}, none, none}},
		{"three", survey{[]float64{0.1, 0.2, 0.15}, none, none}},
		{"three that share alike", survey{[]float64{0.1, 0.2, 0.15}, []float64{0.2, 0.2, 0.2}, none}},
		{"three that share with both signs", survey{[]float64{0.1, 0.2, 0.15}, []float64{0.2, -0.1, 0.1}, none}},
		{"four, of which two share", survey{[]float64{0.1, 0.2, 0.15, 0.1}, []float64{0, 0.2, 0, -0.2}, none}},
	} {
		n := sets()
		pair, all := make([]float64, n), make([]float64, n)
		for s := range n {
			r := c.survey.compare(t, uint64(s), 500)
			pair[s], all[s] = r.Tensions[0].P, r.Consistency[0].P
		}
		checkUniform(t, c.name+", a pair", pair)
		checkUniform(t, c.name+", all", all)
	}
}

// checkUniform holds the Kolmogorov–Smirnov distance below 1.95/√n, which one
// set in a thousand exceeds by chance, plus what 500 draws blur: 1/√500 of a
// standard deviation in the mean, 0.01 in p.
func checkUniform(t *testing.T, name string, p []float64) {
	t.Helper()
	sort.Float64s(p)
	distance := 0.0
	for i, v := range p {
		distance = math.Max(distance, math.Abs(v-(float64(i)+0.5)/float64(len(p))))
	}
	if limit := 1.95/math.Sqrt(float64(len(p))) + 0.01; distance > limit {
		t.Errorf("%s: p is not uniform: Kolmogorov–Smirnov distance %.4f above %.4f", name, distance, limit)
	}
}

// Under a known disagreement the significance scatters about it by one: with a
// bias of 3σ of the difference in one of two, sigma is N(3, 1). Sharing the
// nuisance takes its error out of the difference.
func TestSigmaUnderDisagreement(t *testing.T) {
	v := survey{[]float64{0.1, 0.2}, []float64{0.3, 0.3}, []float64{3 * math.Hypot(0.1, 0.2), 0}}
	n := sets()
	sigma := make([]float64, n)
	for s := range n {
		sigma[s] = v.compare(t, uint64(s), 2000).Tensions[0].Sigma
	}
	mean, sd := meanSD(sigma)
	// Three times the Monte Carlo error of n sets; and what the tail beyond the
	// draws is allowed, 0.15σ at 4σ, weighed by how few sets lie there.
	if tolerance := 3/math.Sqrt(float64(n)) + 0.03; math.Abs(mean-3) > tolerance {
		t.Errorf("mean sigma %.3f, want 3 within %.3f", mean, tolerance)
	}
	if tolerance := 3/math.Sqrt(2*float64(n)) + 0.03; math.Abs(sd-1) > tolerance {
		t.Errorf("sigma scatters by %.3f, want 1 within %.3f", sd, tolerance)
	}
}
