package xray

import (
	"context"
	"strings"
	"testing"

	"steelyard/probes/catalogue"
	"steelyard/probes/estimate"
	"steelyard/probes/method"
)

func onlyTemperature(t testing.TB, table *catalogue.Table) *estimate.Task {
	return &estimate.Task{
		Name: "xray.a", Object: estimate.Object{Redshift: 0.2}, Cosmology: flat(t, 70, 0.3),
		Tables: map[string]*catalogue.Table{"temperature": table, "density": table},
		Blocks: map[string]method.Settings{"temperature": {}, "density": {}}, Settings: method.Settings{},
	}
}

// A fault in the data names the file, the row and what to do.
func TestFaultyBins(t *testing.T) {
	type rows struct{ inner, outer, value, minus, plus []float64 }
	good := func() rows {
		return rows{[]float64{0, 100, 200}, []float64{100, 200, 400}, []float64{6, 7, 5}, []float64{.1, .2, .3}, []float64{.1, .2, .4}}
	}
	for _, c := range []struct {
		name  string
		spoil func(*rows)
		want  []string
	}{
		{"zero value", func(r *rows) { r.value[1] = 0 }, []string{"bins.csv, row 2", "temperature of 0 is not positive"}},
		{"negative value", func(r *rows) { r.value[2] = -3 }, []string{"bins.csv, row 3", "-3 is not positive"}},
		{"negative error", func(r *rows) { r.minus[0] = -0.1 }, []string{"bins.csv, row 1", "negative error", "sizes"}},
		{"error of zero", func(r *rows) { r.plus[1] = 0 }, []string{"bins.csv, row 2", "error of zero"}},
		{"unsorted", func(r *rows) { r.inner[1], r.outer[1] = 500, 600 }, []string{"bins.csv, row 3", "not in order of radius", "row 2"}},
		{"overlap", func(r *rows) { r.inner[1] = 90 }, []string{"bins.csv, row 2", "overlaps the one in row 1", "90 kpc"}},
		{"no width", func(r *rows) { r.outer[2] = 200 }, []string{"bins.csv, row 3", "does not lie outside the inner edge"}},
		{"inside the centre", func(r *rows) { r.inner[0] = -5 }, []string{"bins.csv, row 1", "inside the centre"}},
		{"two faults", func(r *rows) { r.value[0], r.minus[2] = -1, 0 }, []string{"row 1", "row 3"}},
		{"eV instead of keV", func(r *rows) { r.value = []float64{6000, 7000, 5000} }, []string{"bins.csv", "6000 keV", "unit"}},
	} {
		r := good()
		c.spoil(&r)
		_, err := reduceTemperature(context.Background(), onlyTemperature(t, table("bins.csv", column("inner", "kpc", r.inner), column("outer", "kpc", r.outer),
			column("value", "keV", r.value), column("minus", "keV", r.minus), column("plus", "keV", r.plus))))
		if err == nil {
			t.Errorf("%s: accepted", c.name)
			continue
		}
		for _, w := range append(c.want, "xray.a: ") {
			if !strings.Contains(err.Error(), w) {
				t.Errorf("%s: %q lacks %q", c.name, err, w)
			}
		}
	}
}

func TestTooFewBins(t *testing.T) {
	one := []float64{1}
	tab := table("one.csv", column("inner", "kpc", []float64{0}), column("outer", "kpc", []float64{100}), column("value", "keV", one), column("error", "keV", one))
	task := onlyTemperature(t, tab)
	fillDefaults(backward.Settings, task.Settings)
	s := annuli(0, 100)
	if _, err := newBackward(&fit{task: task, gas: gasOf(coolCore), spectra: s}); err == nil || !strings.Contains(err.Error(), "single temperature bin") {
		t.Errorf("a single temperature bin: %v", err)
	}
	if _, err := reduceDensity(context.Background(), onlyTemperature(t, tab)); err == nil || !strings.Contains(err.Error(), "at least 3") {
		t.Errorf("a single shell: %v", err)
	}
	empty := &catalogue.Table{File: "empty.csv"}
	if _, err := reduceTemperature(context.Background(), onlyTemperature(t, empty)); err == nil || !strings.Contains(err.Error(), "no rows") {
		t.Errorf("no rows: %v", err)
	}
	if _, err := reduceTemperature(context.Background(), onlyTemperature(t, table("bare.csv", column("value", "keV", one)))); err == nil || !strings.Contains(err.Error(), "needs its edges") {
		t.Errorf("no edges: %v", err)
	}
}

// An emission measure (cm⁻⁶ kpc, or a spectral fit's norm) is not a density.
func TestEmissionMeasureForDensity(t *testing.T) {
	tab := table("em.csv", column("inner", "kpc", []float64{0, 50, 100}), column("outer", "kpc", []float64{50, 100, 200}),
		column("value", "cm**-3", []float64{250, 332, 648}), column("error", "cm**-3", []float64{2, 3, 6}))
	if _, err := reduceDensity(context.Background(), onlyTemperature(t, tab)); err == nil || !strings.Contains(err.Error(), "emission measure") {
		t.Errorf("an emission measure: %v", err)
	}
}

// Every way of writing the same bins gives the same bytes: edges or middles,
// lengths or angles, from the centre or from the outside in, sizes or bounds.
func TestSpellingsOfBins(t *testing.T) {
	distance := flat(t, 70, 0.3).AngularDiameter(0.2)
	reverse := func(v []float64) []float64 { return []float64{v[2], v[1], v[0]} }
	inner, outer, value := []float64{0, 64, 128}, []float64{64, 128, 256}, []float64{6, 7, 5}
	size := []float64{0.25, 0.5, 0.75}
	want := ""
	for i, tab := range []*catalogue.Table{
		table("a", column("inner", "kpc", inner), column("outer", "kpc", outer), column("value", "keV", value), column("error", "keV", size)),
		table("b", column("radius", "kpc", []float64{32, 96, 192}), column("half_width", "kpc", []float64{32, 32, 64}), column("value", "keV", value), column("minus", "keV", size), column("plus", "keV", size)),
		table("c", column("inner", "kpc", reverse(inner)), column("outer", "kpc", reverse(outer)), column("value", "keV", reverse(value)),
			column("low", "keV", []float64{4.25, 6.5, 5.75}), column("high", "keV", []float64{5.75, 7.5, 6.25})),
	} {
		out, err := reduceTemperature(context.Background(), onlyTemperature(t, tab))
		if err != nil {
			t.Fatal(err)
		}
		b, _ := out.MarshalBinary()
		if i == 0 {
			want = string(b)
		} else if string(b) != want {
			t.Errorf("%s: other bytes than in the first spelling", tab.File)
		}
	}
	angle := func(v []float64) []float64 { return []float64{v[0] / distance, v[1] / distance, v[2] / distance} }
	out, err := reduceTemperature(context.Background(), onlyTemperature(t, table("d", column("inner", "rad", angle(inner)), column("outer", "rad", angle(outer)), column("value", "keV", value), column("error", "keV", size))))
	if err != nil {
		t.Fatal(err)
	}
	s := out.(*Spectra)
	for i := range inner {
		near(t, "outer edge from an angle", s.Outer[i], outer[i], 1e-15)
	}
}

// Bins that miss each other by rounding touch; a real gap is told.
func TestGaps(t *testing.T) {
	value, e := []float64{6, 7, 5}, []float64{.1, .2, .3}
	read := func(inner, outer []float64) *Spectra {
		out, err := reduceTemperature(context.Background(), onlyTemperature(t, table("bins.csv", column("inner", "kpc", inner), column("outer", "kpc", outer), column("value", "keV", value), column("error", "keV", e))))
		if err != nil {
			t.Fatal(err)
		}
		return out.(*Spectra)
	}
	s := read([]float64{0, 99.99, 200.01}, []float64{100, 200, 400})
	if s.Inner[1] != 100 || s.Inner[2] != 200 || len(s.Notes) != 0 {
		t.Errorf("edges that touch but for rounding: %v, %q", s.Inner, s.Notes)
	}
	s = read([]float64{0, 100, 250}, []float64{100, 200, 400})
	if len(s.Notes) != 1 || !strings.Contains(s.Notes[0], "no temperature between 200 kpc and 250 kpc (rows 2 and 3)") {
		t.Errorf("a gap: %q", s.Notes)
	}
}
