package lensing

import (
	"math"
	"testing"

	"steelyard/probes/halo"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// TestAroundOffset compares the mean tangential shear about a wrong centre with
// ΔΣ of the mean surface density about it, Σ(R|d) = (1/2π)∫Σ(r)dφ (Johnston et
// al. 2007), integrated here by brute force.
func TestAroundOffset(t *testing.T) {
	nfw := halo.NewNFW(8e14, 4.5, 200*background(t).CriticalDensity(0.25))
	around := func(R, d float64) float64 {
		const n = 1000
		sum := 0.0
		for i := range n {
			c := math.Cos(math.Pi * (float64(i) + 0.5) / n)
			sum += nfw.SurfaceDensity(math.Sqrt(R*R + d*d - 2*R*d*c))
		}
		return sum / n
	}
	for _, x := range []struct{ R, d, tolerance float64 }{
		{300, 1, 1e-6}, {300, 50, 1e-6}, {300, 100, 1e-6}, {1000, 200, 1e-6},
		{100, 200, 1e-4}, // a small difference of large numbers
		// On the circle through the halo the shear turns round abruptly.
		{300, 250, 2e-3}, {300, 350, 2e-2},
	} {
		mean := 0.0 // of Σ inside R, in rings finer inwards: R' = R u², 2R'dR'/R² = 4u³du
		const rings = 600
		for i := range rings {
			u := (float64(i) + 0.5) / rings
			mean += around(x.R*u*u, x.d) * 4 * u * u * u / rings
		}
		got := aroundOffset(x.R, x.d, nfw.ExcessSurfaceDensity)
		want := mean - around(x.R, x.d)
		if math.Abs(got-want) > x.tolerance*nfw.ExcessSurfaceDensity(x.R)+1e-5*mean { // the rings' own error
			t.Errorf("ΔΣ(%g | %g) = %.6g, want %.6g", x.R, x.d, got, want)
		}
	}
	if got := aroundOffset(300, 0, nfw.ExcessSurfaceDensity); got != nfw.ExcessSurfaceDensity(300) {
		t.Errorf("without an offset ΔΣ = %g", got)
	}
}

// TestMiscentring recovers a known distance, and without data the Rayleigh
// distribution that was asked for.
func TestMiscentring(t *testing.T) {
	threshold := 200 * background(t).CriticalDensity(0.25)
	exact := halo.NewNFW(8e14, 4.5, threshold)
	task := profileOf(t, exact, 0.001)
	s := signal{critical: task.Cosmology.SigmaCritical(0.25, math.Inf(1)), elongation: 1, distance: 1, response: 1, offset: 120}
	s.bins = reduced(t, task).Bins
	s.predict(exact, task.Tables["profile"].Values("value"))
	settings := defaults(tangentialShear)
	settings["concentration"] = method.Exactly(4.5)
	settings["miscentring"] = method.Distributed(prior.Uniform(0, 400))
	_, d := fitted(t, task, settings)
	m := infer.Percentiles(parameter(t, d, "mass_200c"), 2.5, 97.5)
	off := infer.Percentiles(parameter(t, d, "miscentring"), 2.5, 97.5)
	if !(off[0] < 120 && 120 < off[1]) || !(m[0] < 8e14 && 8e14 < m[1]) || off[1]-off[0] > 40 {
		t.Errorf("distance %.4g, mass %.4g", off, m)
	}

	flat := profileOf(t, exact, 50)
	settings["mass"] = method.Exactly(8e14)
	settings["miscentring"] = method.Exactly(70)
	settings["shear_bias"] = method.Distributed(prior.Normal(0, 0.02))
	_, d = fitted(t, flat, settings)
	// Rayleigh percentiles σ (−2 ln(1−p))^½; 4000 draws know them to 1.5% or so.
	q := infer.Percentiles(parameter(t, d, "miscentring"), 16, 50, 84)
	for i, p := range []float64{0.16, 0.5, 0.84} {
		near(t, "percentile", q[i], 70*math.Sqrt(-2*math.Log(1-p)), 0.05)
	}
}
