package halo

import (
	"math"
	"strings"
	"testing"

	"steelyard/probes/cosmology"
)

func TestDefinitionNames(t *testing.T) {
	for want, d := range map[string]Definition{
		"500c": {500, "critical"}, "200m": {200, "mean"}, "virial": {0, "virial"}, "337.5c": {337.5, "critical"},
	} {
		if got := d.String(); got != want {
			t.Errorf("%+v is called %q, want %q", d, got, want)
		}
	}
}

func TestRefusals(t *testing.T) {
	c := background(t)
	curved, err := cosmology.New(cosmology.Params{HubbleConstant: 70, OmegaMatter: 0.3, OmegaLambda: 0.6, W0: -1})
	if err != nil {
		t.Fatal(err)
	}
	h := NewNFW(8e14, 4.5, 200*c.CriticalDensity(0.25))
	core := CoredIsothermal{Sigma: 500, Core: 300} // central density 1.03e5 Msun/kpc³; 500c is 8.7e4
	for _, r := range []struct {
		name string
		m    Model
		d    Definition
		c    *cosmology.Cosmology
		says string
	}{
		{"unknown reference", h, Definition{500, "background"}, c, `"background"`},
		{"no overdensity", h, Definition{0, "critical"}, c, "overdensity 0"},
		{"negative overdensity", h, Definition{-200, "mean"}, c, "overdensity -200"},
		{"NaN overdensity", h, Definition{math.NaN(), "mean"}, c, "overdensity NaN"},
		{"infinite overdensity", h, Definition{math.Inf(1), "mean"}, c, "overdensity +Inf"},
		{"virial in a curved background", h, Definition{Of: "virial"}, curved, "Bryan & Norman 1998"},
		{"denser than the core", core, Definition{1e5, "critical"}, c, "no radius"},
		{"model of nothing", NFW{}, Definition{500, "critical"}, c, "no radius"},
		{"model of NaN", NFW{math.NaN(), 300}, Definition{500, "critical"}, c, "no radius"},
	} {
		mass, radius, err := Convert(r.m, r.d, r.c, 0.25)
		switch {
		case err == nil:
			t.Errorf("%s: %g Msun inside %g kpc", r.name, mass, radius)
		case !strings.Contains(err.Error(), r.says):
			t.Errorf("%s: the message does not mention %q: %v", r.name, r.says, err)
		}
	}
	for _, threshold := range []float64{0, -1, math.NaN(), math.Inf(1)} {
		if r, err := RadiusAt(h, threshold); err == nil {
			t.Errorf("threshold %g: radius %g", threshold, r)
		}
	}
	if _, _, err := Convert(core, Definition{500, "critical"}, c, 0.25); err != nil {
		t.Errorf("inside the reach of the core: %v", err)
	}
}

var sink float64

// halos4000 draws the halos of a posterior, without chance.
func halos4000(threshold float64) []NFW {
	h := make([]NFW, 4000)
	for i := range h {
		u := float64(i) / 4000
		h[i] = NewNFW(5e14*math.Exp(0.2*math.Sin(40*u)), 4+2*u, threshold)
	}
	return h
}

// BenchmarkRadiusAt finds R_500 of one halo.
func BenchmarkRadiusAt(b *testing.B) {
	c := background(b)
	h := halos4000(200 * c.CriticalDensity(0.25))
	threshold := 500 * c.CriticalDensity(0.25)
	b.ReportAllocs()
	i := 0
	for b.Loop() {
		r, err := RadiusAt(h[i%4000], threshold)
		if err != nil {
			b.Fatal(err)
		}
		sink = r
		i++
	}
}

// BenchmarkModels evaluates one radius of each model; the radii run over two
// decades.
func BenchmarkModels(b *testing.B) {
	for _, m := range []struct {
		name string
		m    Model
	}{
		{"nfw", NFW{1.2e6, 390}},
		{"isothermal", Isothermal{1000}},
		{"cored-isothermal", CoredIsothermal{1000, 50}},
		{"hernquist", Hernquist{1e15, 500}},
		{"einasto", Einasto{2.9e5, 390, 0.18}},
		{"beta", Beta{5e5, 150, 0.6}},
	} {
		radii := make([]float64, 73)
		for i := range radii {
			radii[i] = 30 * math.Pow(100, float64(i)/72)
		}
		for _, q := range []struct {
			name string
			f    func(float64) float64
		}{
			{"mass", m.m.Mass},
			{"projected", func(R float64) float64 { s, n := Projected(m.m, R); return s + n }},
		} {
			b.Run(m.name+"/"+q.name, func(b *testing.B) {
				b.ReportAllocs()
				i := 0
				for b.Loop() {
					sink = q.f(radii[i%73])
					i++
				}
			})
		}
	}
}
