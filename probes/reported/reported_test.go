package reported

import (
	"context"
	"encoding/json"
	"math"
	"os"
	"strings"
	"testing"

	"steelyard/probes/cosmology"
	"steelyard/probes/estimate"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

func flat(t *testing.T, hubble, matter float64) *cosmology.Cosmology {
	t.Helper()
	c, err := cosmology.New(cosmology.Params{HubbleConstant: hubble, OmegaMatter: matter, OmegaLambda: 1 - matter, W0: -1})
	if err != nil {
		t.Fatal(err)
	}
	return c
}

// quote is a task for a mass of 6.1 +0.9 −0.8 × 10¹⁴ Msun at z = 0.25 with the
// given settings and the defaults of the others.
func quote(t *testing.T, settings method.Settings) *estimate.Task {
	t.Helper()
	mass, err := prior.TwoPiece(6.1e14, 0.8e14, 0.9e14)
	if err != nil {
		t.Fatal(err)
	}
	all := method.Settings{"mass": {Set: true, Prior: mass}, "probe": method.Word("lensing"), "concentration": method.Exactly(4)}
	for _, s := range Settings() {
		if v, ok := settings[s.Name]; ok {
			all[s.Name] = v
		} else if _, ok := all[s.Name]; !ok && s.Default.Set {
			all[s.Name] = s.Default
		}
	}
	return &estimate.Task{
		Name: "reported.earlier", Object: estimate.Object{Redshift: 0.25}, Cosmology: flat(t, 70, 0.3), Settings: all,
		Sampling: infer.Options{Draws: 2000, Stream: infer.NewStream("reported")},
	}
}

func overdensity(delta float64) method.Value {
	v := method.Exactly(delta)
	v.Text = "critical"
	return v
}

// masses returns M_Δ and R_Δ of every draw.
func masses(t *testing.T, task *estimate.Task, d *infer.Draws, delta float64) (mass, radius []float64) {
	t.Helper()
	threshold := delta * task.Cosmology.CriticalDensity(task.Object.Redshift)
	for i := range d.N {
		r, ok := d.RadiusAt(i, threshold)
		if !ok {
			t.Fatalf("draw %d has no R_%g", i, delta)
		}
		mass = append(mass, 4*math.Pi/3*threshold*r*r*r)
		radius = append(radius, r)
	}
	return mass, radius
}

// In its own cosmology a mass comes back as quoted: its 16th, 50th and 84th
// percentiles are those of the two-piece normal.
func TestUnchangedInItsOwnCosmology(t *testing.T) {
	task := quote(t, method.Settings{"overdensity": overdensity(500)})
	for _, stated := range []*cosmology.Cosmology{nil, flat(t, 70, 0.3)} {
		d, err := Estimate(context.Background(), task, stated)
		if err != nil {
			t.Fatal(err)
		}
		m, r := masses(t, task, d, 500)
		got := infer.Percentiles(m, 16, 50, 84)
		for k, want := range []float64{5.3e14, 6.1e14, 7.0e14} {
			// Four standard errors of a percentile of 2000 draws: 4 √(pq/n)/density.
			if !(math.Abs(got[k]-want) <= 0.12e14) {
				t.Errorf("percentile %d: %.4g, want %.4g", k, got[k], want)
			}
		}
		// Draw by draw the mass inside its own R_500 is the mass drawn; 1e-4 is
		// the grid's promise.
		for i, want := range d.Parameter("reported_mass").Values {
			if !(math.Abs(m[i]/want-1) <= 2e-4) {
				t.Fatalf("draw %d: M_500 %.6g, drawn %.6g", i, m[i], want)
			}
		}
		covers := infer.Percentiles(r, 16, 84)
		if !(math.Abs(d.Covers[0]/covers[0]-1) <= 1e-3 && math.Abs(d.Covers[1]/covers[1]-1) <= 1e-3) {
			t.Errorf("covers %v, want the spread of R_500, %v", d.Covers, covers)
		}
	}
}

// The rules against numbers computed outside: see the source in the file.
func TestCarriedToAnotherCosmology(t *testing.T) {
	data, err := os.ReadFile("../../testdata/reported/carried.json")
	if err != nil {
		t.Fatal(err)
	}
	var file struct {
		Rows []struct {
			Via                 string
			Overdensity, Radius float64
			Projected           bool
			M500, R500, M200    float64
			MassInsideMpc       float64 `json:"mass_1Mpc"`
		}
	}
	if err := json.Unmarshal(data, &file); err != nil {
		t.Fatal(err)
	}
	if len(file.Rows) != 12 {
		t.Fatalf("%d rows", len(file.Rows))
	}
	for _, row := range file.Rows {
		set := method.Settings{"via": method.Word(row.Via), "projected": {Set: true, Flag: row.Projected}, "source_redshift": method.Exactly(1.4)}
		if row.Radius > 0 {
			set["radius"] = method.Exactly(row.Radius)
		} else {
			set["overdensity"] = overdensity(row.Overdensity)
		}
		task := quote(t, set)
		task.Settings["mass"] = method.Value{Set: true, Prior: prior.Prior{Kind: prior.NormalKind, A: 6.1e14, B: 1}}
		task.Sampling.Draws = 3
		d, err := Estimate(context.Background(), task, flat(t, 73, 0.27))
		if err != nil {
			t.Fatal(err)
		}
		m500, r500 := masses(t, task, d, 500)
		m200 := d.Parameter("mass_200c").Values
		inside := d.LnMassAt(0, math.Log(1000))
		for _, c := range []struct {
			what              string
			got, want, within float64
		}{
			{"M_200", m200[0], row.M200, 1e-8}, // quadrature of both sides
			{"M_500", m500[0], row.M500, 3e-4}, // read off the grid, good to 1e-4 in R
			{"R_500", r500[0], row.R500, 1e-4},
			{"M(<1 Mpc)", math.Exp(inside), row.MassInsideMpc, 1e-4},
		} {
			if !(math.Abs(c.got/c.want-1) <= c.within) {
				t.Errorf("via %s, projected %v, radius %g: %s = %.10g, want %.10g", row.Via, row.Projected, row.Radius, c.what, c.got, c.want)
			}
		}
	}
}

// With H0 alone changed everything scales: M_Δ ∝ 1/h for hydrostatic, lensing
// and dispersion masses.
func TestHubbleConstantScaling(t *testing.T) {
	for _, via := range []string{"hydrostatic", "jeans", "virial", "caustic", "shear", "strong-lensing", "dispersion-scaling"} {
		task := quote(t, method.Settings{"overdensity": overdensity(500), "via": method.Word(via)})
		task.Sampling.Draws = 50
		before, err := Estimate(context.Background(), task, nil)
		if err != nil {
			t.Fatal(err)
		}
		after, err := Estimate(context.Background(), task, flat(t, 100, 0.3))
		if err != nil {
			t.Fatal(err)
		}
		for i, m := range before.Parameter("mass_200c").Values {
			if got := after.Parameter("mass_200c").Values[i] / m; !(math.Abs(got/(100./70)-1) <= 1e-8) {
				t.Fatalf("via %s: mass moved by %.10g, want 100/70", via, got)
			}
		}
	}
}

// The quoted cylinder is the halo's cylinder, and a halo seen end-on has less
// mass in the sphere than it seems.
func TestCylinderAndElongation(t *testing.T) {
	set := method.Settings{"radius": method.Exactly(300), "projected": {Set: true, Flag: true}}
	task := quote(t, set)
	task.Sampling.Draws = 20
	d, err := Estimate(context.Background(), task, nil)
	if err != nil {
		t.Fatal(err)
	}
	set["elongation"] = method.Exactly(1.25)
	round := quote(t, set)
	round.Sampling.Draws = 20
	e, err := Estimate(context.Background(), round, nil)
	if err != nil {
		t.Fatal(err)
	}
	for i, m := range d.Parameter("reported_mass").Values {
		inside := d.LnMassAt(i, math.Log(300))
		if ratio := math.Exp(inside) / m; !(ratio > 0.4 && ratio < 0.9) {
			t.Fatalf("the sphere holds %.2f of the cylinder", ratio)
		}
		thin := e.LnMassAt(i, math.Log(300))
		if !(thin < inside-math.Log(1.25)*0.8) {
			t.Fatalf("elongation 1.25 changes ln M by %.3f", thin-inside)
		}
	}
	if d.Covers != [2]float64{300, 300} {
		t.Errorf("covers %v", d.Covers)
	}
}

func TestWordsOfTheResult(t *testing.T) {
	task := quote(t, method.Settings{"overdensity": overdensity(500), "probe": method.Word("sz"), "source": method.Word("a value invented")})
	task.Sampling.Draws = 10
	d, err := Estimate(context.Background(), task, flat(t, 73, 0.27))
	if err != nil {
		t.Fatal(err)
	}
	said := strings.Join(append(d.Assumes, d.Warnings...), "\n")
	for _, want := range []string{"a value invented", "via gas-mass", "H0 = 73", "500 times the critical density", "calibrated on X-ray masses", "concentration 4"} {
		if !strings.Contains(said, want) {
			t.Errorf("%q is not said:\n%s", want, said)
		}
	}
	if strings.Contains(said, "prior on M_200c") {
		t.Errorf("the datum is called a prior:\n%s", said)
	}
}

func TestBadQuotes(t *testing.T) {
	five := method.Settings{"overdensity": overdensity(500)}
	with := func(name string, v method.Value) method.Settings {
		s := method.Settings{"overdensity": five["overdensity"]}
		s[name] = v
		return s
	}
	for _, c := range []struct {
		name, want string
		set        method.Settings
	}{
		{"no error", "has no error", with("mass", method.Exactly(6e14))},
		{"no place", "either `radius` or `overdensity`", method.Settings{}},
		{"two places", "either `radius` or `overdensity`", with("radius", method.Exactly(1000))},
		{"projected overdensity", "inside a radius", with("projected", method.Value{Set: true, Flag: true})},
		{"source in front", "not behind the object", with("source_redshift", method.Exactly(0.2))},
		{"shape of a hydrostatic mass", "from lensing only", method.Settings{"overdensity": overdensity(500), "probe": method.Word("xray"), "elongation": method.Exactly(1.2)}},
		{"impossible shape", "elongation must be positive", with("elongation", method.Distributed(prior.Normal(0.1, 1)))},
	} {
		_, err := Estimate(context.Background(), quote(t, c.set), nil)
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q", c.name, err, c.want)
		}
	}
}

// An error as wide as the mass itself must not yield masses below zero.
func TestWideError(t *testing.T) {
	task := quote(t, method.Settings{"overdensity": overdensity(500), "mass": method.Distributed(prior.Normal(2e14, 2e14))})
	d, err := Estimate(context.Background(), task, nil)
	if err != nil {
		t.Fatal(err)
	}
	for i, m := range d.Parameter("reported_mass").Values {
		if m <= 0 {
			t.Fatalf("draw %d is %g", i, m)
		}
	}
}

func BenchmarkEstimate(b *testing.B) {
	mass, err := prior.TwoPiece(6.1e14, 0.8e14, 0.9e14)
	if err != nil {
		b.Fatal(err)
	}
	c, err := cosmology.New(cosmology.Params{HubbleConstant: 70, OmegaMatter: 0.3, OmegaLambda: 0.7, W0: -1})
	if err != nil {
		b.Fatal(err)
	}
	settings := method.Settings{}
	for _, s := range Settings() {
		settings[s.Name] = s.Default
	}
	settings["mass"], settings["probe"], settings["overdensity"] = method.Value{Set: true, Prior: mass}, method.Word("lensing"), overdensity(500)
	task := &estimate.Task{Name: "reported.earlier", Object: estimate.Object{Redshift: 0.25}, Cosmology: c, Settings: settings}
	for b.Loop() {
		if _, err := Estimate(context.Background(), task, nil); err != nil {
			b.Fatal(err)
		}
	}
}
