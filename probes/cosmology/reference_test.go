package cosmology

import (
	"encoding/json"
	"math"
	"os"
	"testing"
)

// reads decodes a file of reference numbers, which names its source.
func reads(t testing.TB, name string, into any) {
	t.Helper()
	data, err := os.ReadFile("../../testdata/cosmology/" + name)
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(data, into); err != nil {
		t.Fatalf("%s: %v", name, err)
	}
}

// near fails unless got agrees with want to a relative tolerance.
func near(t testing.TB, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance*math.Abs(want)) {
		t.Errorf("%s = %.16g, want %.16g (off by %.1g)", what, got, want, got/want-1)
	}
}

func must(t testing.TB, p Params) *Cosmology {
	t.Helper()
	c, err := New(p)
	if err != nil {
		t.Fatal(err)
	}
	return c
}

var flat = Params{HubbleConstant: 70, OmegaMatter: 0.3, OmegaLambda: 0.7, W0: -1}

type background struct {
	Name  string
	H0    float64
	Om0   float64
	Ode0  float64
	W0    float64
	Wa    float64
	Tcmb0 float64
	Orad  float64
	Ok0   float64
}

type distances struct {
	Backgrounds []background
	Rows        []struct {
		In                string
		Z, E, H           float64
		DC                float64 `json:"D_C"`
		DM                float64 `json:"D_M"`
		DA                float64 `json:"D_A"`
		DL                float64 `json:"D_L"`
		Modulus           float64 `json:"distmod"`
		Critical          float64 `json:"rho_crit_Msun_kpc3"`
		Mean              float64 `json:"rho_mean_Msun_kpc3"`
		OmegaMatter       float64 `json:"Omega_m_z"`
		Lookback          float64 `json:"lookback_Gyr"`
		Age               float64 `json:"age_Gyr"`
		KiloparsecsArcsec float64 `json:"kpc_per_arcsec"`
	}
	Pairs []struct {
		In     string
		Z1, Z2 float64
		DA     float64 `json:"D_A12"`
		Ratio  float64 `json:"ratio_Dls_over_Ds"`
	}
	SigmaCritical []struct {
		In     string
		Zl, Zs float64
		Value  float64 `json:"Sigma_cr_Msun_kpc2"`
		Beta   float64
	} `json:"sigma_critical"`
}

func build(t testing.TB, of []background) map[string]*Cosmology {
	made := map[string]*Cosmology{}
	for _, b := range of {
		made[b.Name] = must(t, Params{b.H0, b.Om0, b.Ode0, b.W0, b.Wa, b.Tcmb0})
	}
	return made
}

// TestDistances holds seven backgrounds at ten redshifts to independent numbers
// of 16 digits. 1e-12 leaves room for the error New allows in the integrals.
func TestDistances(t *testing.T) {
	var want distances
	reads(t, "distances.json", &want)
	if len(want.Backgrounds) != 7 || len(want.Rows) != 70 || len(want.Pairs) != 77 || len(want.SigmaCritical) != 28 {
		t.Fatal("distances.json is not complete")
	}
	made := build(t, want.Backgrounds)
	const tolerance = 1e-12
	for _, r := range want.Rows {
		c := made[r.In]
		for _, q := range []struct {
			name      string
			got, want float64
		}{
			{"E", c.E(r.Z), r.E},
			{"H", c.H(r.Z), r.H},
			{"D_C", c.Comoving(r.Z) / 1e3, r.DC},
			{"D_M", c.TransverseComoving(r.Z) / 1e3, r.DM},
			{"D_A", c.AngularDiameter(r.Z) / 1e3, r.DA},
			{"D_L", c.LuminosityDistance(r.Z) / 1e3, r.DL},
			{"distance modulus", c.DistanceModulus(r.Z), r.Modulus},
			{"critical density", c.CriticalDensity(r.Z), r.Critical},
			{"mean density", c.MeanDensity(r.Z), r.Mean},
			{"Ω_m", c.OmegaMatter(r.Z), r.OmegaMatter},
			{"lookback time", c.LookbackTime(r.Z), r.Lookback},
			{"age", c.Age(r.Z), r.Age},
			{"kpc per arcsec", c.KpcPerArcsec(r.Z), r.KiloparsecsArcsec},
		} {
			near(t, r.In+": "+q.name, q.got, q.want, tolerance)
		}
	}
	for _, r := range want.Pairs {
		c := made[r.In]
		near(t, r.In+": D_A between", c.AngularDiameterBetween(r.Z1, r.Z2)/1e3, r.DA, tolerance)
		if r.Z2 < r.Z1 {
			if beta := c.Efficiency(r.Z1, r.Z2); beta != 0 {
				t.Errorf("%s: β of a foreground source = %g", r.In, beta)
			}
			continue
		}
		near(t, r.In+": β", c.Efficiency(r.Z1, r.Z2), r.Ratio, tolerance)
	}
	for _, r := range want.SigmaCritical {
		c := made[r.In]
		near(t, r.In+": Σ_cr", c.SigmaCritical(r.Zl, r.Zs), r.Value, tolerance)
		near(t, r.In+": β", c.Efficiency(r.Zl, r.Zs), r.Beta, tolerance)
	}
}

// TestRadiation holds photons and massless neutrinos to astropy in double
// precision, out to the last scattering of light. Its integrals carry 1e-12;
// its own E is rounded to a few 1e-16.
func TestRadiation(t *testing.T) {
	var want struct {
		Backgrounds []background
		Rows        []struct {
			In          string
			Z, E        float64
			DC          float64 `json:"D_C"`
			DA          float64 `json:"D_A"`
			Lookback    float64 `json:"lookback_Gyr"`
			OmegaMatter float64 `json:"Omega_m_z"`
		}
	}
	reads(t, "radiation.json", &want)
	for i := range want.Backgrounds {
		want.Backgrounds[i].W0 = -1
	}
	made := build(t, want.Backgrounds)
	for _, b := range want.Backgrounds {
		c := made[b.Name]
		// Ten digits of σ_SB, and the 0.2271… of the neutrinos, enter here.
		near(t, b.Name+": Ω_r", c.Params().OmegaRadiation(), b.Orad, 1e-9)
		if math.Abs(c.OmegaCurvature()-b.Ok0) > 1e-12 {
			t.Errorf("%s: Ω_k = %g, want %g", b.Name, c.OmegaCurvature(), b.Ok0)
		}
	}
	if got := want.Backgrounds[0]; math.Abs(must(t, Params{got.H0, got.Om0, 0, -1, 0, got.Tcmb0}.Flat()).Params().OmegaLambda-got.Ode0) > 1e-12 {
		t.Error("Flat does not leave room for radiation")
	}
	for _, r := range want.Rows {
		c := made[r.In]
		const tolerance = 1e-11
		near(t, r.In+": E", c.E(r.Z), r.E, tolerance)
		near(t, r.In+": D_C", c.Comoving(r.Z)/1e3, r.DC, tolerance)
		near(t, r.In+": D_A", c.AngularDiameter(r.Z)/1e3, r.DA, tolerance)
		near(t, r.In+": lookback time", c.LookbackTime(r.Z), r.Lookback, tolerance)
		near(t, r.In+": Ω_m", c.OmegaMatter(r.Z), r.OmegaMatter, tolerance)
	}
}

// TestGrowth holds the growth factor to closed forms of matter, curvature and Λ
// and of constant w. What a start at ln a = −14 leaves out is of the order of
// Ω_k a/Ω_m = 1e-7 in the shape; the rest is the step of the integration.
func TestGrowth(t *testing.T) {
	var all distances
	reads(t, "distances.json", &all)
	made := build(t, append(all.Backgrounds, background{Name: "flat-w-0.8", H0: 70, Om0: 0.3, Ode0: 0.7, W0: -0.8}))
	var want struct {
		Rows []struct {
			In   string
			Z, D float64
		}
	}
	reads(t, "growth.json", &want)
	if len(want.Rows) < 30 {
		t.Fatal("growth.json is not complete")
	}
	for _, r := range want.Rows {
		near(t, r.In+": D", made[r.In].GrowthFactor(r.Z), r.D, 3e-8)
	}
}
