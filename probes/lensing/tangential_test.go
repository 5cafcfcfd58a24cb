package lensing

import (
	"bytes"
	"context"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// profileOf is a profile without noise of a model in the bins of profileTask,
// its sources at redshift 1.
func profileOf(t testing.TB, m halo.Model, sigma float64) *estimate.Task {
	task := profileTask(t)
	s := signal{critical: task.Cosmology.SigmaCritical(0.25, math.Inf(1)), elongation: 1, distance: 1, response: 1}
	s.bins = reduced(t, profileTask(t, column("error", "", ones(5)...))).Bins
	g, e := make([]float64, 5), make([]float64, 5)
	s.predict(m, g)
	for i := range e {
		e[i] = sigma
	}
	inner, outer := task.Tables["profile"].Columns[0], task.Tables["profile"].Columns[1]
	task.Tables["profile"] = table("shear.csv", inner, outer, column("value", "", g...), column("error", "", e...))
	return task
}

func parameter(t testing.TB, d *infer.Draws, name string) []float64 {
	t.Helper()
	p := d.Parameter(name)
	if p == nil {
		t.Fatalf("no parameter %q", name)
	}
	return p.Values
}

// TestRecoverProfile fits data made of the model itself, with small errors:
// the truth comes back within them.
func TestRecoverProfile(t *testing.T) {
	threshold := 200 * background(t).CriticalDensity(0.25)
	task := profileOf(t, halo.NewNFW(8e14, 4.5, threshold), 0.001)
	settings := defaults(tangentialShear)
	settings["concentration"] = method.Distributed(prior.LogUniform(1, 20))
	_, d := fitted(t, task, settings)
	m := infer.Percentiles(parameter(t, d, "mass_200c"), 16, 50, 84)
	c := infer.Percentiles(parameter(t, d, "concentration"), 16, 50, 84)
	if !(m[0] < 8e14 && 8e14 < m[2]) || !(c[0] < 4.5 && 4.5 < c[2]) {
		t.Errorf("mass %.4g, concentration %.4g", m, c)
	}
	if m[2]-m[0] > 0.1*8e14 {
		t.Errorf("mass %.4g: wider than errors of 1%% of the shear allow", m)
	}
	if d.Quality.Chi2 > 1e-3 || d.Quality.Dof != 3 || !d.Quality.Converged {
		t.Errorf("%+v", d.Quality)
	}
	if d.Covers != [2]float64{100, 3000} {
		t.Errorf("covers %v", d.Covers)
	}
	// The masses on the grid are the parameters'.
	ln := d.LnMass[:len(d.Radii)]
	nfw := halo.NewNFW(parameter(t, d, "mass_200c")[0], parameter(t, d, "concentration")[0], threshold)
	for j, r := range d.Radii {
		near(t, "ln M", ln[j], math.Log(nfw.Mass(r)), 1e-14)
	}

	_, again := fitted(t, task, settings)
	a, errA := d.MarshalBinary()
	b, errB := again.MarshalBinary()
	if errA != nil || errB != nil || !bytes.Equal(a, b) {
		t.Errorf("the same fit twice differs: %v, %v", errA, errB)
	}
}

func TestRecoverIsothermal(t *testing.T) {
	task := profileOf(t, halo.Isothermal{Sigma: 1100}, 0.002)
	settings := defaults(tangentialShear)
	settings["halo"] = method.Word("isothermal")
	_, d := fitted(t, task, settings)
	s := infer.Percentiles(parameter(t, d, "dispersion"), 16, 50, 84)
	if !(s[0] < 1100 && 1100 < s[2]) || s[2]-s[0] > 20 {
		t.Errorf("dispersion %.5g", s)
	}
	sphere := halo.NewIsothermal(parameter(t, d, "mass_200c")[7], 200*background(t).CriticalDensity(0.25))
	near(t, "dispersion", parameter(t, d, "dispersion")[7], sphere.Sigma, 1e-14)
	if d.Parameter("concentration") != nil {
		t.Error("an isothermal sphere has a concentration")
	}
	if d.Quality.Dof != 4 {
		t.Errorf("%d degrees of freedom", d.Quality.Dof)
	}
	if a := strings.Join(d.Assumes, "\n"); !strings.Contains(a, "isothermal") || strings.Contains(a, "concentration") {
		t.Errorf("assumes %q", a)
	}
}

// TestAssumptions moves one assumption at a time to an exact value that the
// data were not made with. Each moves the mass as its equation says, here on
// an isothermal sphere far out, where g = β κ and κ ∝ σ² ∝ M^(2/3).
func TestAssumptions(t *testing.T) {
	task := profileOf(t, halo.Isothermal{Sigma: 200}, 1e-4)
	median := func(name string, x float64) float64 {
		settings := defaults(tangentialShear)
		settings["halo"] = method.Word("isothermal")
		if name != "" {
			settings[name] = method.Exactly(x)
		}
		_, d := fitted(t, task, settings)
		if d.Parameter(name) != nil {
			t.Errorf("%s was drawn", name)
		}
		return infer.Percentiles(parameter(t, d, "mass_200c"), 50)[0]
	}
	plain := median("", 0)
	for _, x := range []struct {
		name     string
		value    float64
		response float64 // what multiplies the shear
	}{
		{"shear_bias", 0.1, 1.1},
		{"dilution", 0.2, 0.8},
		{"source_distance_scale", 1.2, 1.2},
		{"elongation", 1.5, 1.5},
	} {
		// κ is about 0.01 at most: what g has beyond first order.
		near(t, x.name, median(x.name, x.value)/plain, math.Pow(x.response, -1.5), 0.01)
	}
}

// TestDrawnAssumptions draws every assumption from a prior; all are reported,
// and the mass is no better known than they.
func TestDrawnAssumptions(t *testing.T) {
	threshold := 200 * background(t).CriticalDensity(0.25)
	task := profileOf(t, halo.NewNFW(8e14, 4.5, threshold), 0.001)
	settings := defaults(tangentialShear)
	elongation := method.Distributed(prior.LogNormal(1, 0.1))
	elongation.Nuisance = "shape"
	settings["elongation"] = elongation
	settings["shear_bias"] = method.Distributed(prior.Normal(0, 0.02))
	settings["dilution"] = method.Distributed(prior.Uniform(0, 0.05))
	settings["source_distance_scale"] = method.Distributed(prior.LogNormal(1, 0.02))
	_, d := fitted(t, task, settings)
	for _, name := range []string{"mass_200c", "concentration", "elongation", "shear_bias", "dilution", "source_distance_scale"} {
		parameter(t, d, name)
	}
	if len(d.Nuisances) != 1 || d.Nuisances[0].Name != "shape" {
		t.Errorf("nuisances %v", d.Nuisances)
	}
	a := strings.Join(d.Assumes, "\n")
	for _, w := range []string{"loguniform(1e+12, 1e+16)", "duffy-2008", "elongation: lognormal(1, 0.1) (nuisance.shape)", "shear_bias: normal(0, 0.02)", "shape noise alone"} {
		if !strings.Contains(a, w) {
			t.Errorf("assumes %q, without %q", a, w)
		}
	}
	m := infer.Percentiles(parameter(t, d, "mass_200c"), 16, 84)
	if width := math.Log(m[1]/m[0]) / 2; width < 0.1 {
		t.Errorf("ln M is known to %.3f with an elongation known to 0.1", width)
	}
	if !d.Quality.Converged {
		t.Errorf("%+v", d.Quality)
	}
}

func TestFitWithin(t *testing.T) {
	threshold := 200 * background(t).CriticalDensity(0.25)
	task := profileOf(t, halo.NewNFW(8e14, 4.5, threshold), 0.001)
	settings := defaults(tangentialShear)
	settings["fit_within"] = method.Value{Set: true, Unit: "kpc", Numbers: []float64{150, 1700}}
	_, d := fitted(t, task, settings)
	if d.Covers != [2]float64{200, 1600} || d.Quality.Dof != 1 {
		t.Errorf("covers %v, %d degrees of freedom", d.Covers, d.Quality.Dof)
	}
	for _, x := range []struct {
		span []float64
		says string
	}{
		{[]float64{150, 1000}, "2 of 5 bins"},
		{[]float64{1000, 150}, "beyond"},
		{[]float64{5000, 9000}, "0 of 5 bins"},
	} {
		p := reduced(t, task)
		_, err := within(p, &estimate.Task{Cosmology: task.Cosmology, Object: task.Object, Settings: method.Settings{"fit_within": {Set: true, Unit: "kpc", Numbers: x.span}}})
		refused(t, x.says, err, "fit_within", x.says)
	}
}

// TestStrongShear says when the shear is too strong for the mean over sources,
// and TestNothing when there is none.
func TestStrongShear(t *testing.T) {
	threshold := 200 * background(t).CriticalDensity(0.25)
	settings := defaults(tangentialShear)
	_, d := fitted(t, profileOf(t, halo.NewNFW(3e15, 8, threshold), 0.002), settings)
	if c := find(t, d, "bins with g above 0.3"); c.Statistic < 1 {
		t.Errorf("%+v", c)
	}
	if w := strings.Join(d.Warnings, "\n"); !strings.Contains(w, "above 0.3 in") {
		t.Errorf("warnings %q", w)
	}
}

func TestNothing(t *testing.T) {
	task := profileTask(t, column("error", "", 0.02, 0.02, 0.02, 0.02, 0.02))
	clear(task.Tables["profile"].Values("value"))
	_, d := fitted(t, task, defaults(tangentialShear))
	if c := find(t, d, "tangential signal-to-noise"); c.Passed || c.Statistic != 0 {
		t.Errorf("%+v", c)
	}
	w := strings.Join(d.Warnings, "\n")
	if !strings.Contains(w, "no tangential shear") || !strings.Contains(w, "prior on the mass matters") {
		t.Errorf("warnings %q", w)
	}
}

func TestRefusedFits(t *testing.T) {
	task := profileTask(t, column("error", "", 0.02, 0.02, 0.02, 0.02, 0.02))
	bytes, err := reduced(t, task).MarshalBinary()
	if err != nil {
		t.Fatal(err)
	}
	for _, x := range []struct {
		name  string
		spoil func(*estimate.Task)
		says  string
	}{
		{"no noise of shapes", func(k *estimate.Task) { k.Settings["covariance"] = method.Words("structure") }, `covariance = ["shape"]`},
		{"nothing to fit", func(k *estimate.Task) {
			k.Settings["mass"], k.Settings["concentration"] = method.Exactly(1e15), method.Exactly(4)
		}, "nothing to fit"},
		{"damaged profile", func(k *estimate.Task) { k.Reduced["profile"] = bytes[:50] }, "damaged"},
		{"no possible concentration", func(k *estimate.Task) {
			k.Settings["concentration"] = method.Distributed(prior.Uniform(-3, -1))
		}, ""},
	} {
		k := *task
		k.Settings, k.Reduced = defaults(tangentialShear), map[string][]byte{"profile": bytes}
		x.spoil(&k)
		_, err := tangentialShear.Run(context.Background(), &k)
		refused(t, x.name, err, "lensing.shear", x.says)
	}
}

// TestRecoverCatalogue weighs one invented catalogue.
func TestRecoverCatalogue(t *testing.T) {
	c := curlew.Shapes(deep, rand.New(rand.NewPCG(20, 21)))
	p, d := fitted(t, shapeTask(t, curlew, c), defaults(tangentialShear))
	m := infer.Percentiles(parameter(t, d, "mass_200c"), 2.5, 97.5)
	if !(m[0] < curlew.M200 && curlew.M200 < m[1]) {
		t.Errorf("mass %.3g to %.3g does not hold %.3g", m[0], m[1], curlew.M200)
	}
	if !d.Quality.Converged || d.Quality.PValue < 0.01 || len(d.Warnings) != 0 {
		t.Errorf("%+v, warnings %q", d.Quality, d.Warnings)
	}
	for _, check := range d.Checks {
		if !check.Passed {
			t.Errorf("%+v", check)
		}
	}
	if s, _, _ := p.signalToNoise(); s < 8 {
		t.Errorf("signal-to-noise %.1f", s)
	}
}

func BenchmarkReduceMillion(b *testing.B) {
	many := deep
	many.Galaxies = 1_000_000
	task := shapeTask(b, curlew, curlew.Shapes(many, rand.New(rand.NewPCG(1, 2))))
	b.ReportAllocs()
	for b.Loop() {
		if _, err := reduce(context.Background(), task); err != nil {
			b.Fatal(err)
		}
	}
}

func benchmarkFit(b *testing.B, settings method.Settings) {
	task := shapeTask(b, curlew, curlew.Shapes(deep, rand.New(rand.NewPCG(1, 2))))
	data, err := reduced(b, task).MarshalBinary()
	if err != nil {
		b.Fatal(err)
	}
	task.Settings, task.Reduced = settings, map[string][]byte{"profile": data}
	task.Sampling.Workers = 1
	for b.Loop() {
		if _, err := tangentialShear.Run(context.Background(), task); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkFitTenBins(b *testing.B) { benchmarkFit(b, defaults(tangentialShear)) }

func BenchmarkFitFourAssumptions(b *testing.B) {
	s := defaults(tangentialShear)
	s["shear_bias"] = method.Distributed(prior.Normal(0, 0.02))
	s["elongation"] = method.Distributed(prior.LogNormal(1, 0.1))
	benchmarkFit(b, s)
}

func BenchmarkLikelihood(b *testing.B) {
	task := shapeTask(b, curlew, curlew.Shapes(deep, rand.New(rand.NewPCG(1, 2))))
	data, err := reduced(b, task).MarshalBinary()
	if err != nil {
		b.Fatal(err)
	}
	task.Settings, task.Reduced = defaults(tangentialShear), map[string][]byte{"profile": data}
	f, err := newLensFit(task)
	if err != nil {
		b.Fatal(err)
	}
	if err := f.addShear(); err != nil {
		b.Fatal(err)
	}
	likelihood := f.parts[0].likelihood()
	b.ReportAllocs()
	for b.Loop() {
		l, _ := f.at([]float64{8e14, 0.1})
		likelihood(l)
	}
}
