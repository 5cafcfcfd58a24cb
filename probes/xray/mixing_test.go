package xray

import (
	"context"
	"fmt"
	"math"
	"strings"
	"testing"

	"steelyard/probes/catalogue"
	"steelyard/probes/halo"
	"steelyard/probes/method"
)

// mixed is a task with three annuli and a mixing matrix.
func mixed(t testing.TB, reversed bool, from, into, share []float64) (*Spectra, error) {
	inner, outer, value, e := []float64{0, 100, 200}, []float64{100, 200, 400}, []float64{6, 7, 5}, []float64{.1, .2, .3}
	if reversed {
		inner, outer, value = []float64{200, 100, 0}, []float64{400, 200, 100}, []float64{5, 7, 6}
	}
	task := onlyTemperature(t, table("kt.csv", column("inner", "kpc", inner), column("outer", "kpc", outer), column("value", "keV", value), column("error", "keV", e)))
	task.Tables["temperature.mixing"] = table("mix.csv", column("from", "", from), column("into", "", into), column("share", "", share))
	out, err := reduceTemperature(context.Background(), task)
	if err != nil {
		return nil, err
	}
	return out.(*Spectra), nil
}

// The temperature of an annulus that light was spread into is that of all the
// gas it sees: numerators and denominators add, not temperatures.
func TestMixing(t *testing.T) {
	s, err := mixed(t, false, []float64{1, 1, 2, 2, 3}, []float64{1, 2, 2, 3, 3}, []float64{0.8, 0.2, 0.7, 0.3, 1})
	if err != nil {
		t.Fatal(err)
	}
	sharp := *s
	sharp.Mixing = nil
	h := halo.NewNFW(truth.M200, truth.C200, 200*truth.CriticalDensity())
	solve := func(s *Spectra) (*atmosphere, *state) {
		a := newAtmosphere(gasOf(coolCore), s, nodesPerEfold)
		st := a.newState()
		a.fill(st, h)
		if !a.solve(st, 0.6, 1, nil) {
			t.Fatal("no atmosphere")
		}
		return a, st
	}
	a, one := solve(&sharp)
	_, two := solve(s)
	sums := func(i int) (hot, cold float64) {
		b := a.bins[i]
		for j, w := range b.weight {
			hot += w * one.hot[b.first+j]
			cold += w * one.cold[b.first+j]
		}
		return hot, cold
	}
	hot1, cold1 := sums(0)
	hot2, cold2 := sums(1)
	near(t, "annulus 1, which only loses light", two.Bins[0], one.Bins[0], 1e-12)
	near(t, "annulus 2", two.Bins[1], (0.2*hot1+0.7*hot2)/(0.2*cold1+0.7*cold2), 1e-12)
	if math.Abs(two.Bins[1]/one.Bins[1]-1) < 1e-4 {
		t.Error("mixing changes nothing")
	}
	b, _ := s.MarshalBinary()
	var back Spectra
	if err := back.UnmarshalBinary(b); err != nil || fmt.Sprint(back.Mixing) != fmt.Sprint(s.Mixing) {
		t.Errorf("mixing after storing: %v, %v", back.Mixing, err)
	}
	// In a file that runs from the outside in, annulus 1 is the outermost.
	r, err := mixed(t, true, []float64{3, 3, 2, 2, 1}, []float64{3, 2, 2, 1, 1}, []float64{0.8, 0.2, 0.7, 0.3, 1})
	if err != nil {
		t.Fatal(err)
	}
	if fmt.Sprint(r.Mixing) != fmt.Sprint(s.Mixing) {
		t.Errorf("from the outside in: %v, want %v", r.Mixing, s.Mixing)
	}
}

func TestFaultyMixing(t *testing.T) {
	for _, c := range []struct {
		from, into, share []float64
		want              string
	}{
		{[]float64{1, 2, 4}, []float64{1, 2, 3}, []float64{1, 1, 1}, "row 3: from 4 into 3: annuli are numbered from 1 to 3"},
		{[]float64{1, 1, 3}, []float64{1, 1, 3}, []float64{0.5, 0.5, 1}, "row 2: from 1 into 1 is given twice"},
		{[]float64{1, 2, 3}, []float64{1, 2, 3}, []float64{1, -0.1, 1}, "row 2: a share of -0.1"},
		{[]float64{1, 3}, []float64{1, 3}, []float64{1, 1}, "the shares of annulus 2 add up to 0"},
		{[]float64{1, 1, 2, 3}, []float64{1, 2, 2, 3}, []float64{0.8, 0.4, 1, 1}, "the shares of annulus 1 add up to 1.2"},
	} {
		if _, err := mixed(t, false, c.from, c.into, c.share); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%v, want %q", err, c.want)
		}
	}
	task := onlyTemperature(t, table("kt.csv", column("inner", "kpc", []float64{0, 1}), column("outer", "kpc", []float64{1, 2}), column("value", "keV", []float64{5, 5}), column("error", "keV", []float64{1, 1})))
	task.Blocks["temperature"] = method.Settings{"projected": {Set: true}}
	task.Tables["temperature.mixing"] = &catalogue.Table{File: "mix.csv"}
	if _, err := reduceTemperature(context.Background(), task); err == nil || !strings.Contains(err.Error(), "not shells") {
		t.Errorf("mixing of shells: %v", err)
	}
}

func TestNarrowAnnuliAreTold(t *testing.T) {
	task := onlyTemperature(t, table("kt.csv", column("inner", "kpc", []float64{0, 50}), column("outer", "kpc", []float64{50, 300}), column("value", "keV", []float64{5, 5}), column("error", "keV", []float64{1, 1})))
	task.Blocks["temperature"] = method.Settings{"psf_width": method.Exactly(60)}
	out, err := reduceTemperature(context.Background(), task)
	if err != nil {
		t.Fatal(err)
	}
	if notes := out.(*Spectra).Notes; len(notes) != 1 || !strings.Contains(notes[0], "1 of 2 annuli are narrower than the point-spread function (60 kpc)") {
		t.Errorf("notes %q", notes)
	}
}
