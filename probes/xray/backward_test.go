package xray

import (
	"context"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"steelyard/probes/catalogue"
	"steelyard/probes/estimate"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/mock"
	"steelyard/probes/prior"
)

// weighed runs backward on the invented object with a seeded noise.
func weighed(t testing.TB, seed uint64, s mock.Spectra, draws int, settings method.Settings) *infer.Draws {
	task := observed(t, truth.Spectra(mock.Gas{Electrons: coolCore.Electrons}, s, rand.New(rand.NewPCG(seed, 1))))
	task.Sampling.Draws = draws
	for name, v := range settings {
		task.Settings[name] = v
	}
	return weigh(t, backward, task)
}

// pull is how far the drawn ln M(<r) lies from the truth, in standard
// deviations, and that standard deviation.
func pull(t testing.TB, d *infer.Draws, r float64) (pull, sd float64) {
	t.Helper()
	var sum, square float64
	for i := range d.N {
		ln := d.LnMassAt(i, math.Log(r))
		sum += ln
		square += ln * ln
	}
	n := float64(d.N)
	mean := sum / n
	sd = math.Sqrt(square/n - mean*mean)
	return (mean - math.Log(truth.Halo().Mass(r))) / sd, sd
}

// The mass comes back from invented data of good quality.
func TestBackwardFindsTheHalo(t *testing.T) {
	d := weighed(t, 1, typical(), 4000, nil)
	if !d.Quality.Converged {
		t.Errorf("not converged: %+v", d.Quality)
	}
	for _, r := range []float64{300, 600, 1000} {
		p, sd := pull(t, d, r)
		// Three standard deviations would happen once in 370 seeds, and an error
		// above a quarter (or below the intrinsic scatter of a tenth) is not what
		// such data yield.
		if math.Abs(p) > 3 || sd > 0.25 || sd < 0.1 {
			t.Errorf("ln M inside %g kpc is off by %.2f standard deviations of %.3f", r, p, sd)
		}
	}
	want := []string{"mass_200c", "concentration", "outer_pressure_ratio", "temperature_scatter", "outer_pressure", "gas_mass_500c", "gas_fraction_500c"}
	var got []string
	for _, p := range d.Parameters {
		got = append(got, p.Name)
	}
	if !slices.Equal(got, want) {
		t.Errorf("reports %q, want %q", got, want)
	}
	distance := truth.AngularDiameter(truth.Redshift) * math.Pi / 180 / 60
	if d.Covers[0] != 0 {
		t.Errorf("covers from %g kpc", d.Covers[0])
	}
	near(t, "covers to", d.Covers[1], 6.5*distance, 1e-6)
	if len(d.Warnings) != 0 {
		t.Errorf("warnings on good data: %q", d.Warnings)
	}
	if !strings.Contains(d.Assumes[0], "loguniform(1e+12, 1e+16) Msun") {
		t.Errorf("the prior on the mass comes first: %q", d.Assumes)
	}
}

// The same task gives the same draws, whatever the number of workers.
func TestBackwardRepeats(t *testing.T) {
	task := observed(t, truth.Spectra(mock.Gas{Electrons: coolCore.Electrons}, typical(), rand.New(rand.NewPCG(1, 1))))
	task.Sampling.Draws = 500
	a := weigh(t, backward, task)
	task.Sampling.Workers = 3
	b := weigh(t, backward, task)
	if !slices.Equal(a.LnMass, b.LnMass) {
		t.Error("another number of workers gives other draws")
	}
}

// What each assumption multiplies, in the fit without noise: gas hotter than
// quoted by a factor, a share of the pressure that is not thermal, a mean
// molecular weight.
func TestAssumptionsMultiply(t *testing.T) {
	masses := func(settings method.Settings) (inner, outer float64) {
		task := observed(t, truth.Spectra(mock.Gas{Electrons: coolCore.Electrons}, typical(), nil))
		for name, v := range settings {
			task.Settings[name] = v
		}
		fillDefaults(backward.Settings, task.Settings)
		s := new(Spectra)
		if err := reduceAll(task); err != nil {
			t.Fatal(err)
		}
		if err := s.UnmarshalBinary(task.Reduced["temperature"]); err != nil {
			t.Fatal(err)
		}
		for i := range s.Minus { // so small that the priors do not pull
			s.Minus[i], s.Plus[i] = s.Minus[i]/1000, s.Plus[i]/1000
		}
		m := backwardOn(t, task, gasOf(coolCore), s)
		best, err := m.prepare()
		if err != nil {
			t.Fatal(err)
		}
		h := m.halo(best.theta)
		return h.Mass(300), h.Mass(1200)
	}
	in, out := masses(nil)
	for _, c := range []struct {
		name   string
		value  float64
		factor float64
	}{
		{"temperature_scale", 1.12, 1.12},
		{"nonthermal_fraction", 0.2, 1 / 0.8},
		{"mean_molecular_weight", 0.61, 0.6 / 0.61},
	} {
		in2, out2 := masses(method.Settings{c.name: method.Exactly(c.value)})
		// Exact in the equations; the fit's own convergence and the mock's rings
		// cost 1e-5.
		near(t, c.name+", inside 300 kpc", in2/in, c.factor, 1e-4)
		near(t, c.name+", inside 1200 kpc", out2/out, c.factor, 1e-4)
	}
}

// A shared nuisance is scored by its prior.
func TestNuisancesAreScored(t *testing.T) {
	scale, err := prior.Normal(1, 0.05)
	if err != nil {
		t.Fatal(err)
	}
	d := weighed(t, 4, typical(), 4000, method.Settings{
		"temperature_scale": {Set: true, Prior: scale, Nuisance: "temperature_scale"},
		"concentration":     method.Related("duffy-2008"),
	})
	if len(d.Nuisances) != 1 || d.Nuisances[0].Name != "temperature_scale" {
		t.Fatalf("nuisances %v", d.Nuisances)
	}
	// The data cannot tell the scale from the mass: it keeps its prior, a unit
	// normal in score. 4000 draws of some 3000 effective: 0.02 on the mean.
	q := infer.Percentiles(d.Nuisances[0].Values, 16, 50, 84)
	if math.Abs(q[1]) > 0.1 || math.Abs((q[2]-q[0])/2-1) > 0.1 {
		t.Errorf("scores of the scale have percentiles %.3v", q)
	}
	if d.Parameter("concentration") == nil {
		t.Error("a concentration that follows a relation is reported too")
	}
}

// Temperatures that scatter more than their errors: the fit says so, and with
// the scatter that is there it is a good one.
func TestPoorFitIsSaid(t *testing.T) {
	s := typical()
	for i := range s.TemperatureErrors {
		s.TemperatureErrors[i] = 0.008
	}
	s.Scatter = 0.06
	const said = "the fit is poor with the quoted temperature errors alone: χ² = "
	d := weighed(t, 5, s, 500, method.Settings{"temperature_scatter": method.Exactly(0)})
	if all := strings.Join(d.Warnings, "\n"); !strings.Contains(all, said) {
		t.Errorf("warnings %q", d.Warnings)
	}
	if len(d.Checks) == 0 || d.Checks[0].Passed {
		t.Errorf("checks %v", d.Checks)
	}
	if d.Quality.PValue > poorFit || d.Parameter("temperature_scatter") != nil {
		t.Errorf("quality %+v", d.Quality)
	}
	task := observed(t, truth.Spectra(mock.Gas{Electrons: coolCore.Electrons}, s, rand.New(rand.NewPCG(5, 1))))
	fillDefaults(backward.Settings, task.Settings)
	if err := reduceAll(task); err != nil {
		t.Fatal(err)
	}
	b, quoted := prepared(t, task)
	if all := strings.Join(b.warnings(quoted), "\n"); !strings.Contains(all, said) || !strings.Contains(all, "drawn with the mass makes up for it") {
		t.Errorf("with the scatter drawn, warnings %q", all)
	}
	best, err := b.best(0.06, b.starts()...)
	if err != nil {
		t.Fatal(err)
	}
	if best.pValue < poorFit {
		t.Errorf("with the scatter that is there χ² = %.1f for %d degrees of freedom", best.chi2, best.dof)
	}
}

func TestCautions(t *testing.T) {
	values := func(task *estimate.Task, block, name string) []float64 { return task.Tables[block].Values(name) }
	for name, c := range map[string]struct {
		spoil func(*estimate.Task)
		want  string
	}{
		"cool gas": {func(task *estimate.Task) {
			for _, col := range []string{"value", "minus", "plus"} {
				for i := range values(task, "temperature", col) {
					values(task, "temperature", col)[i] /= 3
				}
			}
		}, "below 3 keV the weight"},
		"short density": {func(task *estimate.Task) { truncate(task.Tables["density"], 0, 40) }, "the density between is extrapolated"},
		"late density":  {func(task *estimate.Task) { truncate(task.Tables["density"], 25, 50) }, "the density inside is extrapolated"},
		"few bins":      {func(task *estimate.Task) { truncate(task.Tables["temperature"], 3, 6) }, "3 temperature bins for 3 free parameters"},
		"bad density": {func(task *estimate.Task) {
			for i := range values(task, "density", "value") {
				values(task, "density", "value")[i] *= 1 + 0.2*math.Cos(3*float64(i))
			}
		}, "the density form fits its data poorly"},
	} {
		task := observed(t, truth.Spectra(mock.Gas{Electrons: coolCore.Electrons}, typical(), rand.New(rand.NewPCG(6, 1))))
		c.spoil(task)
		fillDefaults(backward.Settings, task.Settings)
		if err := reduceAll(task); err != nil {
			t.Fatal(err)
		}
		b, quoted := prepared(t, task)
		warnings := b.warnings(quoted)
		if all := strings.Join(warnings, "\n"); !strings.Contains(all, c.want) {
			t.Errorf("%s: warnings %q lack %q", name, warnings, c.want)
		}
	}
}

// A prior that leaves no mass for the gas, or reductions of another version,
// end in an error that names the estimate.
func TestImpossible(t *testing.T) {
	task := observed(t, truth.Spectra(mock.Gas{Electrons: coolCore.Electrons}, typical(), nil))
	fillDefaults(backward.Settings, task.Settings)
	task.Reduced = map[string][]byte{"density": {1}, "temperature": {2}}
	if _, err := backward.Run(context.Background(), task); err == nil || !strings.Contains(err.Error(), task.Name) {
		t.Errorf("damaged reductions: %v", err)
	}
	// Gas that rises outwards for ever has no finite weight.
	rising := &Gas{Form: Beta, Parameters: []float64{0.003, 100, -0.6}}
	m := backwardOn(t, task, rising, annuli(0, 100, 300, 900))
	if _, err := m.prepare(); err == nil || !strings.Contains(err.Error(), "can hold this gas") {
		t.Errorf("gas of infinite weight: %v", err)
	}
}

// truncate keeps the rows from to to−1.
func truncate(table *catalogue.Table, from, to int) {
	table.Rows = table.Rows[from:to]
	for i := range table.Columns {
		table.Columns[i].Values = table.Columns[i].Values[from:to]
	}
}
