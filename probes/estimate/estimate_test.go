package estimate

import (
	"math"
	"strings"
	"testing"

	"steelyard/probes/catalogue"
	"steelyard/probes/cosmology"
	"steelyard/probes/halo"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

func task(t *testing.T, settings method.Settings) *Task {
	t.Helper()
	c, err := cosmology.New(cosmology.Params{HubbleConstant: 70, OmegaMatter: 0.3, OmegaLambda: 0.7, W0: -1})
	if err != nil {
		t.Fatal(err)
	}
	return &Task{
		Name: "a.test", Object: Object{Redshift: 0.25}, Cosmology: c, Settings: settings,
		Sampling: infer.Options{Draws: 4000, Stream: infer.NewStream("test")},
	}
}

// Carrying a mass along an NFW halo gives back the mass at the anchor, whatever
// the anchor, and the halo has the concentration asked for.
func TestCarryReturnsTheMassAtItsAnchor(t *testing.T) {
	relation := method.Related("duffy-2008")
	for name, v := range map[string]method.Value{"fixed": method.Exactly(4.5), "relation": relation} {
		tk := task(t, method.Settings{"concentration": v})
		var p Parameters
		c, err := p.Concentration(tk)
		if err != nil {
			t.Fatal(err)
		}
		theta := make([]float64, len(p.Free))
		threshold := 500 * tk.Cosmology.CriticalDensity(0.25)
		for _, at := range []Anchor{{Radius: 200}, {Radius: 1000}, {Radius: 3000}, {Radius: 150, Projected: true}, {Threshold: threshold}, {Threshold: threshold / 2.5}, {Threshold: 5 * threshold}} {
			for _, mass := range []float64{3e12, 1e14, 4e14} {
				h, err := tk.Carry(mass, at, c, theta)
				if err != nil {
					t.Fatalf("%s, %+v, %g: %v", name, at, mass, err)
				}
				got, err := anchored(h, at)
				if err != nil {
					t.Fatal(err)
				}
				// The root is found to 1e-12 in ln M_200; masses follow it with a
				// power of order one.
				if math.Abs(got/mass-1) > 1e-10 {
					t.Errorf("%s, %+v: %.12g, want %g", name, at, got, mass)
				}
				r200, err := halo.RadiusAt(h, 200*tk.Cosmology.CriticalDensity(0.25))
				if err != nil {
					t.Fatal(err)
				}
				if want := c.Of(theta, h.Mass(r200)); math.Abs(r200/h.Rs/want-1) > 1e-9 {
					t.Errorf("%s, %+v: concentration %.6g, want %.6g", name, at, r200/h.Rs, want)
				}
			}
		}
		if _, err := tk.Carry(1e25, Anchor{Radius: 1000}, c, theta); err == nil {
			t.Error("a mass beyond any halo was carried")
		}
	}
}

// point is a fit whose only parameter is ln M_200c, normal about ln 5e14.
func point(t *testing.T, tk *Task, width float64, p *Parameters) Fit {
	t.Helper()
	pr, err := prior.LogNormal(5e14, width)
	if err != nil {
		t.Fatal(err)
	}
	m := p.Draw("mass_200c", "solMass", pr)
	threshold := 200 * tk.Cosmology.CriticalDensity(0.25)
	return Fit{
		Sample: p.DrawPriors(tk.Sampling), Parameters: p, Covers: [2]float64{100, 2000},
		LnMass: func(theta, radii, out []float64) error {
			h := halo.NewNFW(m.Of(theta), 4, threshold)
			for i, r := range radii {
				out[i] = math.Log(h.Mass(r))
			}
			return nil
		},
	}
}

// The intrinsic scatter widens ln M at a fixed radius by its square, and the
// reported mass_200c is that of the widened profiles.
func TestIntrinsicScatter(t *testing.T) {
	spread := func(tk *Task) (float64, *infer.Draws) {
		var p Parameters
		d, err := tk.Finish(point(t, tk, 0.1, &p))
		if err != nil {
			t.Fatal(err)
		}
		sum, square := 0.0, 0.0
		for i := range d.N {
			v := d.LnMassAt(i, math.Log(1000))
			sum, square = sum+v, square+v*v
		}
		mean := sum / float64(d.N)
		return square/float64(d.N) - mean*mean, d
	}
	without, _ := spread(task(t, nil))
	with, d := spread(task(t, method.Settings{"intrinsic_scatter": method.Exactly(0.2)}))
	// A variance of 4000 draws is known to √(2/4000) = 2.2%; three of these, and
	// as much again for the correlation of the two samples by chance.
	if math.Abs((with-without)/0.04-1) > 0.1 {
		t.Errorf("the scatter added %.4f to the variance, want 0.04", with-without)
	}
	threshold := 200 * task(t, nil).Cosmology.CriticalDensity(0.25)
	for i := range 20 {
		r, ok := d.RadiusAt(i, threshold)
		if !ok {
			t.Fatal("no r_200")
		}
		want := 4 * math.Pi / 3 * threshold * r * r * r
		if got := d.Parameter("mass_200c").Values[i]; math.Abs(got/want-1) > 1e-9 {
			t.Errorf("draw %d: mass_200c %.6g, the profile has %.6g", i, got, want)
		}
	}
}

// A nuisance reaches the draws as the score of its prior.
func TestNuisancesAreScores(t *testing.T) {
	pr, err := prior.LogNormal(1, 0.1)
	if err != nil {
		t.Fatal(err)
	}
	tk := task(t, method.Settings{"elongation": {Set: true, Prior: pr, Nuisance: "elongation"}})
	var p Parameters
	e := p.Assume(tk.Settings, "elongation")
	f := point(t, tk, 0.1, &p)
	if !e.Drawn() {
		t.Fatal("a nuisance was not drawn")
	}
	d, err := tk.Finish(f)
	if err != nil {
		t.Fatal(err)
	}
	if len(d.Nuisances) != 1 || d.Nuisances[0].Name != "elongation" {
		t.Fatalf("nuisances: %+v", d.Nuisances)
	}
	for i, theta := range f.Sample.Values {
		if got, want := d.Nuisances[0].Values[i], math.Log(e.Of(theta))/0.1; math.Abs(got-want) > 1e-9 {
			t.Fatalf("draw %d: score %.9g, want %.9g", i, got, want)
		}
	}
}

// A posterior at the end of its prior, and a mass below five times its error,
// are said.
func TestWarnings(t *testing.T) {
	tk := task(t, method.Settings{"mass": method.Distributed(prior.LogUniform(1e12, 1e16))})
	var p Parameters
	u, err := prior.Uniform(0, 1)
	if err != nil {
		t.Fatal(err)
	}
	p.Draw("anisotropy", "", u)
	f := point(t, tk, 0.4, &p)
	for _, theta := range f.Sample.Values {
		theta[0] = 1 - 0.01*theta[0]*theta[0]
	}
	f.Chi2, f.Dof = 60, 10
	d, err := tk.Finish(f)
	if err != nil {
		t.Fatal(err)
	}
	all := strings.Join(d.Warnings, "\n")
	for _, want := range []string{"anisotropy piles up at the upper end", "below 5: the prior on the mass matters", "poorly fitted: χ² = 60.0 for 10"} {
		if !strings.Contains(all, want) {
			t.Errorf("%q is missing from:\n%s", want, all)
		}
	}
	if strings.Contains(all, "mass_200c piles up") {
		t.Error("a prior without ends cannot be piled up at")
	}
	// From scipy.stats.chi2.sf(60, 10).
	if math.Abs(d.Quality.PValue/3.6243009520614924e-09-1) > 1e-10 {
		t.Errorf("p = %g", d.Quality.PValue)
	}
}

// A length given as an angle becomes kpc by the angular-diameter distance.
func TestKpc(t *testing.T) {
	tk := task(t, nil)
	got := tk.Kpc(&catalogue.Column{Unit: "rad", Values: []float64{math.Pi / 180 / 3600}})
	// astropy 5.2.1: FlatLambdaCDM(70, 0.3).kpc_proper_per_arcmin(0.25)/60.
	if math.Abs(got[0]/3.9100813002845944-1) > 1e-10 {
		t.Errorf("%.6f kpc", got[0])
	}
	if got := tk.Kpc(&catalogue.Column{Unit: "kpc", Values: []float64{7}}); got[0] != 7 {
		t.Errorf("%v", got)
	}
}
