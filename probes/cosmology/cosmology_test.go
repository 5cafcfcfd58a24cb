package cosmology

import (
	"math"
	"strings"
	"sync"
	"testing"

	"pgregory.net/rapid"
)

// TestRefusals asks for backgrounds that cannot be ours.
func TestRefusals(t *testing.T) {
	inf, nan := math.Inf(1), math.NaN()
	for _, c := range []struct {
		name string
		p    Params
		says string // part of the message; "" when the background is sound
	}{
		{"flat", flat, ""},
		{"no dark energy, w left at zero", Params{HubbleConstant: 50, OmegaMatter: 1}, ""},
		{"negative Λ", Params{70, 0.3, -0.3, -1, 0, 0}, ""},
		{"dense and closed", Params{70, 2, 0, -1, 0, 0}, ""},
		{"with photons", Params{70, 0.3, 0.7, -1, 0, 2.7255}, ""},
		{"negative H0", Params{-70, 0.3, 0.7, -1, 0, 0}, "hubble_constant"},
		{"h for H0", Params{0.7, 0.3, 0.7, -1, 0, 0}, "hubble_constant"},
		{"nothing stated", Params{}, "hubble_constant"},
		{"NaN", Params{70, nan, 0.7, -1, 0, 0}, "omega_matter"},
		{"infinite", Params{70, 0.3, inf, -1, 0, 0}, "omega_lambda"},
		{"NaN w", Params{70, 0.3, 0.7, nan, 0, 0}, "w0"},
		{"NaN wa", Params{70, 0.3, 0.7, -1, nan, 0}, "wa"},
		{"no matter", Params{70, 0, 1, -1, 0, 0}, "omega_matter"},
		{"negative matter", Params{70, -0.3, 1.3, -1, 0, 0}, "omega_matter"},
		{"negative temperature", Params{70, 0.3, 0.7, -1, 0, -2.7}, "cmb_temperature"},
		{"temperature in other units", Params{70, 0.3, 0.7, -1, 0, 2725.5}, "cmb_temperature"},
		{"w forgotten", Params{70, 0.3, 0.7, 0, 0, 0}, "w0 + wa"},
		{"dark energy that outweighed matter", Params{70, 0.3, 0.7, -0.5, 0.8, 0}, "w0 + wa"},
		// For Ω_m = 0.3 the limit is Ω_Λ = 4Ω_m cosh³(arccosh(1/Ω_m − 1)/3) =
		// 1.7135 (Carroll, Press & Turner 1992).
		{"bounce", Params{70, 0.3, 1.8, -1, 0, 0}, "no big bang"},
		{"bounce, just", Params{70, 0.3, bounce(0.3) + 1e-3, -1, 0, 0}, "no big bang"},
		{"loitering", Params{70, 0.3, bounce(0.3) - 1e-9, -1, 0, 0}, "omega_lambda"},
		{"antipode in view", Params{70, 0.3, 1.65, -1, 0, 0}, "closes space"},
		{"negative dark energy of w = −0.1", Params{70, 0.3, -5, -0.1, 0, 0}, "no big bang"},
	} {
		_, err := New(c.p)
		switch {
		case c.says == "" && err != nil:
			t.Errorf("%s: refused: %v", c.name, err)
		case c.says != "" && err == nil:
			t.Errorf("%s: accepted", c.name)
		case c.says != "" && !strings.Contains(err.Error(), c.says):
			t.Errorf("%s: the message does not mention %q: %v", c.name, c.says, err)
		}
	}
}

func bounce(matter float64) float64 {
	c := math.Cosh(math.Acosh(1/matter-1) / 3)
	return 4 * matter * c * c * c
}

func TestVirialOverdensity(t *testing.T) {
	// The limit of Bryan & Norman 1998 in a flat universe of matter alone.
	got, err := must(t, Params{HubbleConstant: 50, OmegaMatter: 1}).VirialOverdensity(0.5)
	if err != nil || math.Abs(got-18*math.Pi*math.Pi) > 1e-12 {
		t.Errorf("Δ_vir = %g, %v without dark energy; want 18π²", got, err)
	}
	for _, p := range []Params{
		{70, 0.3, 0.6, -1, 0, 0},
		{70, 0.3, 0.7, -0.9, 0, 0},
		{70, 0.3, 0.7, -1, 0.1, 0},
		{70, 0.3, 0.7, -1, 0, 2.7255}, // curved by its radiation
	} {
		if got, err := must(t, p).VirialOverdensity(0.2); err == nil {
			t.Errorf("Δ_vir = %g for %+v; want an error", got, p)
		}
	}
	if _, err := must(t, Params{70, 0.3, 0, -1, 0, 2.7255}.Flat()).VirialOverdensity(0.2); err != nil {
		t.Errorf("flat with radiation: %v", err)
	}
}

func TestEdges(t *testing.T) {
	c := must(t, flat)
	for _, z := range []float64{-0.1, math.NaN()} {
		for name, got := range map[string]float64{
			"D_A": c.AngularDiameter(z), "lookback": c.LookbackTime(z), "growth": c.GrowthFactor(z),
			"between": c.AngularDiameterBetween(z, 1), "Σ_cr": c.SigmaCritical(z, 1),
		} {
			if !math.IsNaN(got) {
				t.Errorf("%s at z = %g is %g, want NaN", name, z, got)
			}
		}
	}
	if d, g := c.AngularDiameter(0), c.GrowthFactor(0); d != 0 || g != 1 {
		t.Errorf("D_A(0) = %g, D(0) = %g", d, g)
	}
	for _, source := range []float64{-0.1, 0, 0.1, 0.3} {
		if beta, sigma := c.Efficiency(0.3, source), c.SigmaCritical(0.3, source); beta != 0 || !math.IsInf(sigma, 1) {
			t.Errorf("source at %g before a lens at 0.3: β = %g, Σ_cr = %g", source, beta, sigma)
		}
	}
	// Computed with mpmath at 30 digits from the horizon of this background.
	near(t, "β at infinity", c.EfficiencyInfinity(0.25), 0.9287775608490308, 1e-12)
	// D_C of a small redshift is cz/H0 (1 − 3Ω_m z/4 + …): here to z² = 1e-18.
	near(t, "Hubble's law", c.Comoving(1e-9), 1e3*speedOfLight/70*1e-9*(1-0.225e-9), 1e-15)
}

// genBackground draws a background New accepts.
func genBackground(t *rapid.T) *Cosmology {
	p := Params{
		HubbleConstant: rapid.Float64Range(40, 100).Draw(t, "H0"),
		OmegaMatter:    rapid.Float64Range(0.1, 1).Draw(t, "Om"),
		OmegaLambda:    rapid.Float64Range(-0.2, 1).Draw(t, "OL"),
		W0:             rapid.Float64Range(-1.5, -0.5).Draw(t, "w0"),
		Wa:             rapid.Float64Range(-1, 0.3).Draw(t, "wa"),
		CMBTemperature: rapid.SampledFrom([]float64{0, 2.7255}).Draw(t, "Tcmb"),
	}
	c, err := New(p)
	if err != nil {
		t.Skipf("refused: %v", err)
	}
	return c
}

// TestQuadrature compares the table of integrals with Simpson's rule in
// ln(1+z), a route of its own, for backgrounds of every kind. With 4000 steps
// its error is below 1e-12.
func TestQuadrature(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		c := genBackground(t)
		z := math.Pow(10, rapid.Float64Range(-4, 2).Draw(t, "lg z"))
		const n = 4000
		h := math.Log1p(z) / n
		var distance, time float64
		for i := range n + 1 {
			s := float64(i) * h
			w := 4 - 2*float64((i+1)%2)
			if i == 0 || i == n {
				w = 1
			}
			e := c.E(math.Expm1(s))
			distance += w * math.Exp(s) / e
			time += w / e
		}
		x, y := c.since(z)
		if math.Abs(distance*h/3/x-1) > 1e-11 || math.Abs(time*h/3/y-1) > 1e-11 {
			t.Fatalf("z = %g: %.15g and %.15g by Simpson, %.15g and %.15g from the table", z, distance*h/3, time*h/3, x, y)
		}
	})
}

// TestIdentities checks relations that hold in every background.
func TestIdentities(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		c := genBackground(t)
		z := rapid.Float64Range(0.01, 6).Draw(t, "z")
		z2 := z + rapid.Float64Range(0.01, 6).Draw(t, "gap")
		rel := func(what string, got, want, tolerance float64) {
			if !(math.Abs(got-want) <= tolerance*math.Abs(want)) {
				t.Fatalf("%s: %.15g, want %.15g", what, got, want)
			}
		}
		rel("age = lookback + age then", c.LookbackTime(z)+c.Age(z), c.Age(0), 1e-14)
		rel("Etherington", c.LuminosityDistance(z), (1+z)*(1+z)*c.AngularDiameter(z), 1e-14)
		rel("Σ_cr", c.SigmaCritical(z, z2)*c.AngularDiameterBetween(z, z2)*c.AngularDiameter(z)/c.AngularDiameter(z2), 1.662916540175601e15, 1e-12)
		rel("forward and back", c.AngularDiameterBetween(z2, z)*(1+z), -c.AngularDiameterBetween(z, z2)*(1+z2), 1e-13)
		// Hogg 1999, eq. 19, for Ω_k ≥ 0.
		if k := c.OmegaCurvature(); k >= 0 {
			u1, u2, d := c.TransverseComoving(z), c.TransverseComoving(z2), c.hubble
			want := (u2*math.Sqrt(1+k*u1*u1/(d*d)) - u1*math.Sqrt(1+k*u2*u2/(d*d))) / (1 + z2)
			rel("between", c.AngularDiameterBetween(z, z2), want, 1e-11)
		}
		// Seen past a quarter of the way round a closed space, things grow again.
		if quarter := c.curvature < 0 && c.root*c.past.comoving[panels] > math.Pi/2; !quarter {
			if b, far := c.Efficiency(z, z2), c.EfficiencyInfinity(z); !(b > 0 && b < far && far < 1) {
				t.Fatalf("β = %g, at infinity %g", b, far)
			}
		}
		rel("Ω_m", c.OmegaMatter(z)*c.CriticalDensity(z), c.MeanDensity(z), 1e-14)
	})
}

// TestGrowthWithRadiation compares the early growth with the solution of
// Meszaros 1974 for matter and radiation, D ∝ 1 + 3a/(2a_eq), where dark energy
// does not matter.
func TestGrowthWithRadiation(t *testing.T) {
	c := must(t, Params{70, 0.3, 0, -1, 0, 2.7255}.Flat())
	equality := c.Params().OmegaRadiation() / 0.3
	for _, z := range []float64{1e5, 1e4, 3e3, 1e3, 300} {
		got := c.GrowthFactor(z) / c.GrowthFactor(100)
		want := (1 + 1.5/(1+z)/equality) / (1 + 1.5/101/equality)
		near(t, "D against z = 100", got, want, 1e-6) // ρ_Λ/ρ_m is 2e-6 at z = 100, its effect on D a tenth of that
	}
}

// TestConcurrent reads one background from many goroutines; the race detector
// gives it its point.
func TestConcurrent(t *testing.T) {
	c := must(t, flat)
	want := must(t, flat).GrowthFactor(1)
	var wg sync.WaitGroup
	got := make([]float64, 8)
	for i := range got {
		wg.Go(func() { got[i] = c.GrowthFactor(1) })
	}
	wg.Wait()
	for i := range got {
		if got[i] != want {
			t.Errorf("goroutine %d: D = %g, want %g", i, got[i], want)
		}
	}
}

var sink float64

func BenchmarkNew(b *testing.B) {
	for b.Loop() {
		c, err := New(flat)
		if err != nil {
			b.Fatal(err)
		}
		sink = c.hubble
	}
}

func BenchmarkEfficiency(b *testing.B) {
	wowa := flat
	wowa.W0, wowa.Wa = -0.9, 0.2
	for _, p := range []struct {
		name string
		p    Params
	}{{"constant", flat}, {"w0wa", wowa}} {
		c, err := New(p.p)
		if err != nil {
			b.Fatal(err)
		}
		b.Run(p.name, func(b *testing.B) {
			b.ReportAllocs()
			z := 0.3
			for b.Loop() {
				sink = c.Efficiency(0.25, z)
				if z += 1e-3; z > 3 {
					z = 0.3
				}
			}
		})
	}
}
