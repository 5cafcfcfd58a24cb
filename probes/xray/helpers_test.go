package xray

import (
	"context"
	"math"
	"testing"

	"steelyard/probes/catalogue"
	"steelyard/probes/cosmology"
	"steelyard/probes/estimate"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/mock"
	"steelyard/probes/prior"
)

// truth is the invented object of the tests, and coolCore its gas.
var (
	truth    = mock.Truth{Redshift: 0.212, HubbleConstant: 70, OmegaMatter: 0.3, M200: 8e14, C200: 4.5}
	coolCore = mock.VikhlininGas{N0: 0.006, Rc: 150, Beta: 0.62, Alpha: 0.7, Rs: 1100, Epsilon: 1.5, N02: 0.03, Rc2: 30, Beta2: 1}
)

// gasOf is the gas known exactly.
func gasOf(v mock.VikhlininGas) *Gas {
	return &Gas{Form: ModifiedBeta, Parameters: []float64{v.N0, v.Rc, v.Beta, v.Alpha, v.Rs, v.Epsilon, 3, v.N02, v.Rc2, v.Beta2}}
}

// annuli are bins with errors of a tenth and no data yet.
func annuli(edges ...float64) *Spectra {
	s := &Spectra{Projected: true}
	for i := range len(edges) - 1 {
		s.Inner, s.Outer = append(s.Inner, edges[i]), append(s.Outer, edges[i+1])
		s.Value, s.Minus, s.Plus = append(s.Value, 5), append(s.Minus, 0.5), append(s.Plus, 0.5)
	}
	return s
}

func column(name, unit string, values []float64) catalogue.Column {
	return catalogue.Column{Name: name, Unit: unit, Values: values}
}

func table(file string, columns ...catalogue.Column) *catalogue.Table {
	t := &catalogue.Table{File: file, Columns: columns}
	for i := range columns[0].Values {
		t.Rows = append(t.Rows, i+1)
	}
	return t
}

func flat(t testing.TB, hubble, matter float64) *cosmology.Cosmology {
	t.Helper()
	c, err := cosmology.New(cosmology.Params{HubbleConstant: hubble, OmegaMatter: matter, OmegaLambda: 1 - matter, W0: -1})
	if err != nil {
		t.Fatal(err)
	}
	return c
}

// observed is a task with the invented profiles as its tables, the angles in
// radians as a recipe's columns arrive.
func observed(t testing.TB, d *mock.SpectraData) *estimate.Task {
	rad := func(arcmin []float64) []float64 {
		out := make([]float64, len(arcmin))
		for i, x := range arcmin {
			out[i] = x * math.Pi / 180 / 60
		}
		return out
	}
	return &estimate.Task{
		Name: "xray.test.backward", Object: estimate.Object{Redshift: truth.Redshift}, Cosmology: flat(t, 70, 0.3),
		Tables: map[string]*catalogue.Table{
			"density": table("density.ecsv", column("inner", "rad", rad(d.DensityInner)), column("outer", "rad", rad(d.DensityOuter)),
				column("value", "cm**-3", d.Density), column("error", "cm**-3", d.DensityError)),
			"temperature": table("temperature.csv", column("inner", "rad", rad(d.TemperatureInner)), column("outer", "rad", rad(d.TemperatureOuter)),
				column("value", "keV", d.Temperature), column("minus", "keV", d.TemperatureErrorMinus), column("plus", "keV", d.TemperatureErrorPlus)),
		},
		Blocks:   map[string]method.Settings{"density": {}, "temperature": {}},
		Settings: method.Settings{}, Reduced: map[string][]byte{},
		Sampling: infer.Options{Stream: infer.NewStream("xray test")},
	}
}

// fillDefaults sets what the task leaves out, as the recipe reader does.
func fillDefaults(settings []method.Setting, to method.Settings) {
	for _, s := range settings {
		if _, ok := to[s.Name]; !ok && s.Default.Set {
			to[s.Name] = s.Default
		}
	}
}

// reduceAll runs the reductions.
func reduceAll(task *estimate.Task) error {
	for _, r := range Probe.Reductions {
		out, err := r.Run(context.Background(), task)
		if err != nil {
			return err
		}
		if task.Reduced[r.Name], err = out.MarshalBinary(); err != nil {
			return err
		}
	}
	return nil
}

// weigh reduces and runs a method.
func weigh(t testing.TB, m estimate.Method, task *estimate.Task) *infer.Draws {
	t.Helper()
	fillDefaults(m.Settings, task.Settings)
	if err := reduceAll(task); err != nil {
		t.Fatal(err)
	}
	d, err := m.Run(context.Background(), task)
	if err != nil {
		t.Fatal(err)
	}
	return d
}

func must(p prior.Prior, err error) method.Value { return method.Distributed(p, err) }

// edgesBetween are n+1 edges evenly spaced in the logarithm, the first set to
// zero when centre is true.
func edgesBetween(from, to float64, n int, centre bool) []float64 {
	e := make([]float64, n+1)
	for i := range e {
		e[i] = from * math.Pow(to/from, float64(i)/float64(n))
	}
	if centre {
		e[0] = 0
	}
	return e
}

// typical is an observation of good quality: 50 shells with errors of 3%, and
// ten annuli with errors of 3% inside rising to 15% outside.
func typical() mock.Spectra {
	return mock.Spectra{
		DensityEdges: edgesBetween(0.05, 8, 50, true), DensityError: 0.03,
		TemperatureEdges:  edgesBetween(0.2, 6.5, 10, true),
		TemperatureErrors: []float64{0.03, 0.03, 0.03, 0.03, 0.04, 0.04, 0.05, 0.07, 0.1, 0.15}, Skew: 0.1,
	}
}

// backwardOn is the fit of backward to the given gas and spectra.
func backwardOn(t testing.TB, task *estimate.Task, gas *Gas, s *Spectra) *backwardFit {
	t.Helper()
	b, err := newBackward(&fit{task: task, gas: gas, spectra: s})
	if err != nil {
		t.Fatal(err)
	}
	return b
}

// prepared is the fit of backward to a task's reductions, before it is drawn.
func prepared(t testing.TB, task *estimate.Task) (*backwardFit, bestFit) {
	f, err := newFit(task)
	if err != nil {
		t.Fatal(err)
	}
	m, err := newBackward(f)
	if err != nil {
		t.Fatal(err)
	}
	best, err := m.prepare()
	if err != nil {
		t.Fatal(err)
	}
	return m, best
}
