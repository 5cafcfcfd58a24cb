package reconcile

import (
	"math/rand/v2"
	"testing"

	"steelyard/probes/halo"
	"steelyard/probes/infer"
)

// fiveEstimates are five estimates of one object, two of which share a nuisance
// with a third and with each other.
func fiveEstimates() []Estimate {
	rng := rand.New(rand.NewPCG(1, 2))
	var out []Estimate
	for k, m := range []model{
		{names: []string{"a"}, level: 33.9, noise: 0.10, effect: linear(0.08)},
		{names: []string{"a", "b"}, level: 34.0, noise: 0.15, effect: linear(0.1, -0.05), weights: []float64{1, 1}, value: 0.4, err: 0.9},
		{names: []string{"b"}, level: 34.1, noise: 0.20, effect: linear(0.12)},
		{level: 33.8, noise: 0.12, effect: linear()},
		{level: 34.2, noise: 0.25, effect: linear()},
	} {
		name := string(rune('p' + k))
		out = append(out, Estimate{Name: name, Block: name, Draws: m.onGrid(rng, 4000)})
	}
	return out
}

// onGrid lays the draws of the model on the full grid, M ∝ r.
func (m model) onGrid(rng *rand.Rand, n int) *infer.Draws {
	d := m.draws(rng, n)
	narrow := d.LnMass
	d.Radii, d.LnMass = infer.Grid(), nil
	for i := range n {
		for j := range d.Radii {
			d.LnMass = append(d.LnMass, narrow[3*i+1]+float64(j-48)*0.14)
		}
	}
	return d
}

// BenchmarkFiveEstimatesAtFiveRadii joins, matches, combines and compares.
func BenchmarkFiveEstimatesAtFiveRadii(b *testing.B) {
	s := Setup{
		Estimates: fiveEstimates(), RadiiFrom: "p", Background: background(b),
		Own: []halo.Definition{{Delta: 2500, Of: "critical"}, {Delta: 500, Of: "critical"}, {Delta: 200, Of: "critical"}},
	}
	for _, d := range s.Own {
		s.Places = append(s.Places, At{Definition: d})
	}
	s.Places = append(s.Places, At{Radius: 800}, At{Radius: 1000})
	for b.Loop() {
		m := matchEstimates(b, s)
		if _, err := Compare(m, Limits, infer.NewStream("bench")); err != nil {
			b.Fatal(err)
		}
	}
}
