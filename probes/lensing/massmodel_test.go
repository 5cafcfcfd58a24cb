package lensing

import (
	"math"
	"strings"
	"testing"

	"steelyard/probes/halo"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// TestProjection compares the table with the model it stands for, as its
// comment promises.
func TestProjection(t *testing.T) {
	table := newProjection(halo.Einasto{RhoS: 1, Rs: 1, Alpha: 0.18})
	h := halo.Einasto{RhoS: 3e5, Rs: 390, Alpha: 0.18}
	p := projected{h, table, h.Rs, h.RhoS * h.Rs}
	for R := 5.0; R < 2e4; R *= 1.37 {
		surface, mean := p.Projected(R)
		wantSurface, wantMean := halo.Projected(h, R)
		near(t, "Σ", surface, wantSurface, 1e-6)
		near(t, "ΔΣ", mean-surface, wantMean-wantSurface, 1e-6)
	}
}

// TestRecoverHaloes fits each model to data made of itself.
func TestRecoverHaloes(t *testing.T) {
	threshold := 200 * background(t).CriticalDensity(0.25)
	const mass = 8e14
	free := method.Distributed(prior.LogUniform(1, 20))
	for _, x := range []struct {
		name      string
		truth     halo.Model
		settings  method.Settings
		parameter string
		want      float64
		dof       int
	}{
		{"nfw", halo.NewNFW(mass, 4.5, threshold), method.Settings{"concentration": free}, "concentration", 4.5, 3},
		{"einasto", halo.NewEinasto(mass, 4.5, 0.18, threshold), method.Settings{"concentration": free}, "concentration", 4.5, 3},
		{"hernquist", halo.NewHernquist(mass, 4.5, threshold), method.Settings{"concentration": free}, "concentration", 4.5, 3},
		{"isothermal", halo.NewIsothermal(mass, threshold), nil, "dispersion", halo.NewIsothermal(mass, threshold).Sigma, 4},
		{"cored-isothermal", halo.NewCoredIsothermal(mass, 80, threshold), nil, "core_radius", 80, 3},
	} {
		task := profileOf(t, x.truth, 0.001)
		settings := defaults(tangentialShear)
		settings["halo"] = method.Word(x.name)
		for name, v := range x.settings {
			settings[name] = v
		}
		_, d := fitted(t, task, settings)
		m := infer.Percentiles(parameter(t, d, "mass_200c"), 2.5, 97.5)
		q := infer.Percentiles(parameter(t, d, x.parameter), 2.5, 97.5)
		if !(m[0] < mass && mass < m[1]) || !(q[0] < x.want && x.want < q[1]) {
			t.Errorf("%s: mass %.4g, %s %.4g", x.name, m, x.parameter, q)
		}
		if d.Quality.Chi2 > 1e-2 || d.Quality.Dof != x.dof {
			t.Errorf("%s: %+v", x.name, d.Quality)
		}
		if d.LnMass[30] != math.Log(must(x.name, t, d, threshold).Mass(d.Radii[30])) {
			t.Errorf("%s: the masses are not those of the parameters", x.name)
		}
		if d.Parameter("concentration") != nil && strings.Contains(x.name, "isothermal") {
			t.Errorf("%s has a concentration", x.name)
		}
	}
	// What a halo does not have is not used, and said.
	odd := defaults(tangentialShear)
	odd["halo"], odd["concentration"] = method.Word("isothermal"), method.Exactly(4)
	_, d := fitted(t, profileOf(t, halo.NewIsothermal(mass, threshold), 0.01), odd)
	if a := strings.Join(d.Assumes, "\n"); !strings.Contains(a, "concentration: not used") {
		t.Errorf("assumes %q", a)
	}
	// The index of an Einasto halo can be drawn.
	settings := defaults(tangentialShear)
	settings["halo"] = method.Word("einasto")
	settings["alpha"] = method.Distributed(prior.Uniform(0.1, 0.3))
	settings["concentration"] = method.Exactly(4.5)
	settings["mass"] = method.Exactly(mass)
	task := profileOf(t, halo.NewEinasto(mass, 4.5, 0.21, threshold), 0.0005)
	task.Sampling.Draws = 200
	_, d = fitted(t, task, settings)
	if q := infer.Percentiles(parameter(t, d, "alpha"), 2.5, 97.5); !(q[0] < 0.21 && 0.21 < q[1]) || q[1]-q[0] > 0.1 {
		t.Errorf("alpha %.4g", q)
	}
}

// must builds the halo of draw 0 from its reported parameters.
func must(kind string, t *testing.T, d *infer.Draws, threshold float64) halo.Model {
	t.Helper()
	mass := parameter(t, d, "mass_200c")[0]
	switch kind {
	case "isothermal":
		return halo.NewIsothermal(mass, threshold)
	case "cored-isothermal":
		return halo.NewCoredIsothermal(mass, parameter(t, d, "core_radius")[0], threshold)
	}
	c := parameter(t, d, "concentration")[0]
	switch kind {
	case "einasto":
		return halo.NewEinasto(mass, c, 0.18, threshold)
	case "hernquist":
		return halo.NewHernquist(mass, c, threshold)
	}
	return halo.NewNFW(mass, c, threshold)
}
