package weighing

import "testing"

// The rule of the Particle Data Group, with its own examples: 0.827 ± 0.119
// becomes 0.83 ± 0.12, and 0.827 ± 0.367 becomes 0.8 ± 0.4 (Workman et al. 2022,
// sect. 5.3); the other rows follow the text of the rule.
func TestRoundingByTheParticleDataGroup(t *testing.T) {
	for _, c := range []struct {
		median, plus, minus float64
		want                string
	}{
		{0.827, 0.119, 0.119, "0.83 +0.12 -0.12"},
		{0.827, 0.367, 0.367, "0.8 +0.4 -0.4"},
		{5.7034, 0.354, 0.354, "5.70 +0.35 -0.35"},
		{5.7034, 0.356, 0.355, "5.7 +0.4 -0.4"},
		{5.7034, 0.0953, 0.0961, "5.70 +0.10 -0.10"},
		{1012.3, 41.7, 38.2, "1010 +40 -40"},
		{12.1, 2.46, 2.51, "12.1 +2.5 -2.5"},
		{3, 1.4, 0.2, "3.00 +1.40 -0.20"},
		{2, 0, 0, "2.00 +0.00 -0.00"},
	} {
		i := Interval{Median: c.median, Lo: c.median - c.minus, Hi: c.median + c.plus}
		if got := i.String(); got != c.want {
			t.Errorf("%g +%g -%g: %q, want %q", c.median, c.plus, c.minus, got, c.want)
		}
	}
}

func TestProbability(t *testing.T) {
	for p, want := range map[float64]string{1: "1.00", 0.13: "0.13", 0.0996: "0.10", 0.0123: "0.012", 0.00123: "0.0012", 0.000123: "1e-04", 3.2e-9: "3e-09"} {
		if got := probability(p); got != want {
			t.Errorf("probability(%g) = %q, want %q", p, got, want)
		}
	}
}
