package dynamics

import (
	"math"
	"slices"

	"steelyard/probes/estimate"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

var massSetting = method.Setting{
	Name: "mass", Kind: method.Number, Unit: "solMass", Low: 1e8, High: 1e18,
	Default: method.Distributed(prior.LogUniform(1e12, 1e16)),
	Doc:     "prior on M_200c",
}

// underMassPrior keeps draws in proportion to the prior on M_200c. They were
// made flat in ln M, as draws of a dispersion flat in ln σ are, so each weighs
// p(M) M; a mass of zero marks a draw for which there is no halo. Equal weights,
// as those of the default prior well inside its limits, leave the draws alone.
func underMassPrior(t *estimate.Task, s *infer.Sample, masses []float64) error {
	mass := t.Settings["mass"].Prior
	if mass.IsExact() {
		return t.Errorf("mass must be a prior such as loguniform(\"1e12 solMass\", \"1e16 solMass\"), not one number")
	}
	n := len(masses)
	weights, highest := make([]float64, n), math.Inf(-1)
	for i, m := range masses {
		weights[i] = math.Inf(-1)
		if m > 0 {
			weights[i] = mass.LogDensity(m) + math.Log(m)
		}
		highest = max(highest, weights[i])
	}
	if math.IsInf(highest, -1) && !(slices.Max(masses) > 0) {
		return t.Errorf("no NFW halo between 1e9 and 1e18 Msun has the mass that the motions ask for")
	}
	if math.IsInf(highest, -1) {
		return t.Errorf("the prior on the mass, %s Msun, excludes all masses that the motions allow (median %.3g Msun)", mass, infer.Percentiles(masses, 50)[0])
	}
	var sum, square float64
	for i := range weights {
		weights[i] = math.Exp(weights[i] - highest)
		sum += weights[i]
		square += weights[i] * weights[i]
	}
	s.Quality.EffectiveDraws = sum * sum / square
	s.Quality.Converged = s.Quality.EffectiveDraws >= float64(n)/10
	if !s.Quality.Converged {
		s.Warnings = append(s.Warnings, "not converged: the prior on the mass leaves less than a tenth of the draws")
	}
	// Systematic resampling: draw j stands where the running sum passes j + u.
	u := t.Sampling.Stream.Sub("mass prior").Rand(0).Float64()
	kept := make([][]float64, 0, n)
	running := 0.0
	for i, w := range weights {
		running += w / sum * float64(n)
		for len(kept) < n && float64(len(kept))+u < running {
			kept = append(kept, s.Values[i])
		}
	}
	for len(kept) < n { // rounding in the running sum
		kept = append(kept, kept[len(kept)-1])
	}
	s.Values = kept
	return nil
}
