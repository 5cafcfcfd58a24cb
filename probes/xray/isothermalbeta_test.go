package xray

import (
	"context"
	"fmt"
	"math"
	"strings"
	"testing"

	"steelyard/probes/catalogue"
	"steelyard/probes/halo"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/mock"
	"steelyard/probes/prior"
)

type isothermalReference struct {
	Models []struct {
		KT, Beta, Rc, Mu float64
		Profile          []struct{ R, Mass float64 }
		Overdensities    []struct{ Redshift, Delta, R, Mass float64 }
	}
}

func TestIsothermalBetaReference(t *testing.T) {
	var ref isothermalReference
	readJSON(t, "isothermal_beta.json", &ref)
	c := flat(t, 70, 0.3)
	for _, m := range ref.Models {
		for _, row := range m.Profile {
			near(t, fmt.Sprintf("kT = %g, r = %g", m.KT, row.R), isothermalBeta(m.KT, m.Beta, m.Rc, m.Mu, row.R), row.Mass, 1e-10)
		}
		for _, o := range m.Overdensities {
			// The mass at the reference's own radius has the mean density asked for.
			near(t, fmt.Sprintf("kT = %g, r_%g", m.KT, o.Delta), isothermalBeta(m.KT, m.Beta, m.Rc, m.Mu, o.R), o.Mass, 1e-10)
			near(t, "mean density", o.Mass/(4*math.Pi/3*o.R*o.R*o.R), o.Delta*c.CriticalDensity(o.Redshift), 1e-9)
		}
	}
}

// From published numbers alone: one temperature and a β model give the closed
// form, its error that of kT, β and rc.
func TestIsothermalBetaMethod(t *testing.T) {
	task := observed(t, &mock.SpectraData{})
	task.Tables = map[string]*catalogue.Table{"temperature": table("kt.csv", column("inner", "kpc", []float64{0}), column("outer", "kpc", []float64{1500}),
		column("value", "keV", []float64{5}), column("error", "keV", []float64{0.1}))}
	task.Blocks["density"] = method.Settings{"model": method.Word("beta"), "n0": method.Exactly(0.004), "rc": must(prior.Normal(200, 10)), "beta": must(prior.Normal(0.67, 0.01))}
	task.Settings["temperature_scatter"], task.Settings["intrinsic_scatter"] = method.Exactly(0), method.Exactly(0)
	d := weigh(t, isothermalBetaMethod, task)
	const r = 1000.0
	ln, ok := d.LnMassesAt(math.Log(r))
	if !ok {
		t.Fatal("no mass at 1 Mpc")
	}
	q := infer.Percentiles(ln, 16, 50, 84)
	// d ln M = dkT/kT + dβ/β − 2 rc drc/(r² + rc²): 0.02, 0.015 and 0.004.
	want := math.Sqrt(0.02*0.02 + 0.01*0.01/(0.67*0.67) + math.Pow(2*200*10/(r*r+200*200), 2))
	if off := q[1] - math.Log(isothermalBeta(5, 0.67, 200, 0.6, r)); math.Abs(off) > 0.1*want {
		t.Errorf("median ln M is off by %.4f", off)
	}
	// 4000 draws give the width to 2%.
	near(t, "error of ln M", (q[2]-q[0])/2, want, 0.08)
	if p := d.Parameter("gas_mass_500c"); p == nil || !(infer.Percentiles(p.Values, 50)[0] > 1e13) {
		t.Error("no gas mass")
	}
	near(t, "covers to", d.Covers[1], 1500, 1e-12)

	task.Blocks["density"]["model"] = method.Word("modified-beta")
	if err := reduceAll(task); err != nil {
		t.Fatal(err)
	}
	if _, err := isothermalBetaMethod.Run(context.Background(), task); err == nil || !strings.Contains(err.Error(), `model = "beta"`) {
		t.Errorf("another form: %v", err)
	}
}

// Every mass model holds the gas and comes back from temperatures without
// noise, made on a finer grid.
func TestEveryHaloRecovered(t *testing.T) {
	threshold := 200 * truth.CriticalDensity()
	for name, h := range map[string]halo.Model{
		"nfw":              halo.NewNFW(8e14, 4.5, threshold),
		"einasto":          halo.NewEinasto(8e14, 4.5, 0.2, threshold),
		"hernquist":        halo.NewHernquist(8e14, 4.5, threshold),
		"isothermal":       halo.NewIsothermal(8e14, threshold),
		"cored-isothermal": halo.NewCoredIsothermal(8e14, 80, threshold),
	} {
		s := annuli(edgesBetween(40, 1500, 10, false)...)
		fine := newAtmosphere(gasOf(coolCore), s, 2*nodesPerEfold)
		st := fine.newState()
		fine.fill(st, h)
		if !fine.solve(st, 0.6, 0.8, nil) {
			t.Fatal(name, "no atmosphere")
		}
		for i, kT := range st.Bins {
			s.Value[i], s.Minus[i], s.Plus[i] = kT, 1e-5, 1e-5 // so small that the priors do not pull
		}
		task := observed(t, &mock.SpectraData{})
		task.Settings["halo"] = method.Word(name)
		fillDefaults(backward.Settings, task.Settings)
		b := backwardOn(t, task, gasOf(coolCore), s)
		b.air = fine
		best, err := b.prepare()
		if err != nil {
			t.Fatal(name, err)
		}
		for _, r := range []float64{100, 500, 1500} {
			near(t, fmt.Sprintf("%s: mass within %g kpc", name, r), b.halo(best.theta).Mass(r), h.Mass(r), 1e-5)
		}
	}
}
