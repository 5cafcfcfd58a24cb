package xray

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/mock"
)

// form is the temperature of the reference cluster.
func (c reference) form() temperature {
	p := c.Temperature
	return temperature{T0: p["T0"], rt: p["rt"], a: p["a"], b: p["b"], c: p["c"], Tmin: p["Tmin"], rcool: p["rcool"], acool: p["acool"]}
}

func forwardOn(t testing.TB, gas *Gas, s *Spectra, settings method.Settings) *forwardFit {
	t.Helper()
	task := observed(t, &mock.SpectraData{})
	for name, v := range settings {
		task.Settings[name] = v
	}
	fillDefaults(forward.Settings, task.Settings)
	w, err := newForward(&fit{task: task, gas: gas, spectra: s}, task.Settings["temperature_form"].Text)
	if err != nil {
		t.Fatal(err)
	}
	return w
}

func TestTemperatureReference(t *testing.T) {
	ref, _ := readReference(t)
	form := ref.form()
	for _, row := range ref.Profile {
		at := fmt.Sprintf(" at %g kpc", row.R)
		near(t, "kT"+at, form.kT(math.Log(row.R)), row.KT, 1e-12)
		near(t, "slope"+at, form.slope(math.Log(row.R)), row.TemperatureSlope, 1e-11)
	}
	short := temperature{T0: 6, rt: 800, b: 2, c: 0.9, Tmin: 1, rcool: 1, acool: 1}
	near(t, "short form", short.kT(math.Log(500)), 6*math.Pow(1+500.*500/(800*800), -0.45), 1e-14)
}

// The mass from the slopes is the reference's, from a numerical derivative of
// the pressure.
func TestHydrostaticMassReference(t *testing.T) {
	ref, gas := readReference(t)
	w := forwardOn(t, gas, annuli(0, 50, 200, 1000), nil)
	form := ref.form()
	theta := make([]float64, len(w.parameters.Free))
	m := &slopes{forwardFit: w}
	for _, row := range ref.Profile {
		at := slopeTable{ln: []float64{math.Log(row.R)}, base: []float64{gas.Form.slope(gas.Parameters, row.R)}}
		near(t, fmt.Sprintf("mass within %g kpc", row.R), m.mass(theta, &form, &at, 0, 1), row.Mass, 1e-10)
	}
}

// Without noise the mass comes back: that of gas whose temperature has the
// form, and that of isothermal gas in closed form.
func TestForwardRecovers(t *testing.T) {
	ref, gas := readReference(t)
	cool := ref.form()
	cool.a = 0
	isothermal := temperature{T0: 5, rt: 800, b: 2, c: 0, Tmin: 1, rcool: 1, acool: 1}
	beta := &Gas{Form: Beta, Parameters: []float64{0.004, 200, 0.67}}
	for _, c := range []struct {
		name string
		gas  *Gas
		form temperature
		want string // the version fitted
		mass func(r float64) float64
	}{
		{"cool core", gas, cool, "full", func(r float64) float64 {
			return isothermalBeta(cool.kT(math.Log(r)), -(gas.Form.slope(gas.Parameters, r)+cool.slope(math.Log(r)))/3, 0, 0.6, r)
		}},
		{"isothermal", beta, isothermal, "short", func(r float64) float64 { return isothermalBeta(5, 0.67, 200, 0.6, r) }},
	} {
		s := annuli(edgesBetween(40, 1500, 12, false)...)
		fine := newAtmosphere(c.gas, s, 2*nodesPerEfold)
		st := fine.newState()
		for j, ln := range fine.grid.ln {
			st.ratio[j], st.kT[j] = 1, c.form.kT(ln)
		}
		fine.look(st)
		for i, kT := range st.Bins {
			s.Value[i], s.Minus[i], s.Plus[i] = kT, 1e-6, 1e-6 // so small that the priors do not pull
		}
		w := forwardOn(t, c.gas, s, method.Settings{"temperature_form": method.Word(c.want)})
		w.air = fine
		best, err := w.best(0, 0)
		if err != nil {
			t.Fatal(err)
		}
		m := w.newSlopes()
		out := make([]float64, len(infer.Grid()))
		if err := m.lnMass(best.theta, infer.Grid(), out); err != nil {
			t.Fatal(err)
		}
		for j, r := range infer.Grid() {
			if r > 60 && r < 1400 {
				near(t, fmt.Sprintf("%s: mass within %.4g kpc", c.name, r), math.Exp(out[j]), c.mass(r), 1e-6)
			}
		}
	}
}

// The mass comes back from invented data of good quality, and never falls with
// radius. The gas has no cool core, so that the short form does.
func TestForwardFindsTheHalo(t *testing.T) {
	plain := mock.VikhlininGas{N0: 0.006, Rc: 150, Beta: 0.62, Rs: 1100, Epsilon: 1.5}
	task := observed(t, truth.Spectra(mock.Gas{Electrons: plain.Electrons}, typical(), rand.New(rand.NewPCG(1, 1))))
	task.Settings["temperature_form"], task.Settings["temperature_scatter"] = method.Word(shortForm), method.Exactly(0)
	task.Sampling.Draws = 1500
	d := weigh(t, forward, task)
	if d.N != 1500 || len(d.LnMass) != 1500*len(d.Radii) {
		t.Fatalf("%d draws", d.N)
	}
	for _, r := range []float64{300, 600, 1000} {
		p, sd := pull(t, d, r)
		// As for backward; without a mass model the error is larger.
		if math.Abs(p) > 3 || sd > 0.4 || sd < 0.1 {
			t.Errorf("ln M inside %g kpc is off by %.2f standard deviations of %.3f", r, p, sd)
		}
	}
	for i := range d.N {
		row := d.LnMass[i*len(d.Radii) : (i+1)*len(d.Radii)]
		for j := range row[1:] {
			if row[j+1] < row[j] {
				t.Fatalf("draw %d: the mass falls from %.4g kpc to %.4g kpc", i, d.Radii[j], d.Radii[j+1])
			}
		}
	}
	if all := strings.Join(d.Assumes, "\n"); !strings.Contains(all, "temperature: kT = T0 (1 + (r/rt)²)^(-c/2)") {
		t.Errorf("the temperature's form is not told: %q", d.Assumes)
	}
	if len(d.Checks) != 2 || d.Checks[1].Name != "share of draws whose mass falls with radius" {
		t.Errorf("checks %v", d.Checks)
	}
}

// Few bins get the short form; too few, or profiles that no equilibrium holds,
// an error.
func TestForwardLimits(t *testing.T) {
	for bins, want := range map[int]int{5: 3, 6: 5, 11: 5, 12: 7} {
		w := forwardOn(t, gasOf(coolCore), annuli(edgesBetween(40, 900, bins, false)...), nil)
		if w.fitted != want {
			t.Errorf("%d bins: %d parameters (%s), want %d", bins, w.fitted, w.form.words, want)
		}
	}
	task := observed(t, &mock.SpectraData{})
	fillDefaults(forward.Settings, task.Settings)
	if _, err := newForward(&fit{task: task, gas: gasOf(coolCore), spectra: annuli(0, 100, 300)}, "by-bins"); err == nil || !strings.Contains(err.Error(), "at least 3") {
		t.Errorf("two bins: %v", err)
	}
	s := annuli(edgesBetween(40, 900, 6, false)...)
	for i := range s.Value { // hotter outwards, faster than any density falls
		s.Value[i] = 2 * math.Pow(1.7, float64(i))
		s.Minus[i], s.Plus[i] = 0.02*s.Value[i], 0.02*s.Value[i]
	}
	hot := forwardOn(t, gasOf(coolCore), s, method.Settings{"temperature_form": method.Word("full")})
	hot.layModes()
	sample := &infer.Sample{}
	for range 50 {
		theta := make([]float64, len(hot.parameters.Free))
		for i, f := range hot.parameters.Free {
			theta[i] = f.Prior.Median()
			switch f.Name {
			case "Tmin":
				theta[i] = 0.01
			case "rcool":
				theta[i] = 2000
			case "acool":
				theta[i] = 5
			}
		}
		sample.Values = append(sample.Values, theta)
	}
	if _, err := hot.leaveOut(sample, hot.newSlopes(), 50); err == nil || !strings.Contains(err.Error(), "try the method backward") {
		t.Errorf("a mass that falls: %v", err)
	}
}
