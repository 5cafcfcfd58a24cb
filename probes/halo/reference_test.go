package halo

import (
	"encoding/json"
	"math"
	"os"
	"strings"
	"testing"

	"steelyard/probes/constants"
	"steelyard/probes/cosmology"
)

// reads decodes a file of reference numbers, which names its source.
func reads(t testing.TB, name string, into any) {
	t.Helper()
	data, err := os.ReadFile("../../testdata/halo/" + name)
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

func background(t testing.TB) *cosmology.Cosmology {
	t.Helper()
	c, err := cosmology.New(cosmology.Params{HubbleConstant: 70, OmegaMatter: 0.3, OmegaLambda: 0.7, W0: -1})
	if err != nil {
		t.Fatal(err)
	}
	return c
}

// TestProfiles holds every model to projections done by quadrature elsewhere, at
// radii from 50 kpc to 3 Mpc. 1e-12 is far above rounding, which the tests at
// extreme radii bound more tightly, and far below any use.
func TestProfiles(t *testing.T) {
	var want struct {
		NFW struct {
			Critical      float64 `json:"rho_crit"`
			R200          float64 `json:"r200c"`
			Rs            float64
			RhoS          float64 `json:"rho_s"`
			SigmaCritical float64 `json:"Sigma_cr_zs1"`
		}
		Einasto struct {
			Alpha float64
			Rs    float64 `json:"r_-2"`
			RhoS  float64 `json:"rho_-2"`
		}
		Hernquist  struct{ Mass, Scale float64 }
		Isothermal struct{ Sigma float64 }
		Beta       struct{ Rho0, Rc float64 }
		Rows       []struct {
			Model   string
			R, Rho  float64
			Mass    float64 `json:"M3D"`
			Surface float64 `json:"Sigma"`
			Mean    float64 `json:"mean_Sigma"`
			Excess  float64 `json:"DeltaSigma"`
			Inside  float64 `json:"M2D"`
		}
	}
	reads(t, "profiles.json", &want)
	c := background(t)
	threshold := 200 * c.CriticalDensity(0.25)
	nfw := NewNFW(8e14, 4.5, threshold)
	near(t, "ρ_crit", c.CriticalDensity(0.25), want.NFW.Critical, 1e-12)
	near(t, "r_s", nfw.Rs, want.NFW.Rs, 1e-12)
	near(t, "ρ_s", nfw.RhoS, want.NFW.RhoS, 1e-12)
	near(t, "Σ_cr", c.SigmaCritical(0.25, 1), want.NFW.SigmaCritical, 1e-12)
	einasto := NewEinasto(8e14, 4.5, want.Einasto.Alpha, threshold)
	near(t, "r₋₂", einasto.Rs, want.Einasto.Rs, 1e-12)
	near(t, "ρ₋₂", einasto.RhoS, want.Einasto.RhoS, 1e-12)
	models := map[string]Model{
		"nfw":        nfw,
		"einasto":    einasto,
		"hernquist":  Hernquist{want.Hernquist.Mass, want.Hernquist.Scale},
		"isothermal": Isothermal{want.Isothermal.Sigma},
		"beta-0.6":   Beta{want.Beta.Rho0, want.Beta.Rc, 0.6},
		"beta-2/3":   Beta{want.Beta.Rho0, want.Beta.Rc, 2.0 / 3},
	}
	seen := map[string]int{}
	for _, r := range want.Rows {
		m := models[r.Model]
		seen[r.Model]++
		const tolerance = 1e-12
		near(t, r.Model+": ρ", m.Density(r.R), r.Rho, tolerance)
		near(t, r.Model+": M", m.Mass(r.R), r.Mass, tolerance)
		near(t, r.Model+": Σ", m.SurfaceDensity(r.R), r.Surface, tolerance)
		near(t, r.Model+": mean Σ", m.MeanSurfaceDensity(r.R), r.Mean, tolerance)
		near(t, r.Model+": ΔΣ", m.ExcessSurfaceDensity(r.R), r.Excess, tolerance)
		near(t, r.Model+": projected mass", m.ProjectedMass(r.R), r.Inside, tolerance)
		surface, mean := Projected(m, r.R)
		if surface != m.SurfaceDensity(r.R) || mean != m.MeanSurfaceDensity(r.R) {
			t.Errorf("%s: Projected(%g) differs from its parts", r.Model, r.R)
		}
	}
	for name := range models {
		if seen[name] < 7 {
			t.Errorf("%s: %d rows of reference numbers", name, seen[name])
		}
	}
}

// TestNFWExtremes covers x of 1e-6 to 1e6 and the seams between formulae.
func TestNFWExtremes(t *testing.T) {
	var want struct {
		Rows []struct{ X, Mass, Surface, Mean, Excess, Potential float64 }
	}
	reads(t, "nfw_extremes.json", &want)
	if len(want.Rows) != 40 {
		t.Fatalf("%d rows", len(want.Rows))
	}
	h := NFW{RhoS: 1, Rs: 1}
	for _, r := range want.Rows {
		const tolerance = 1e-13
		near(t, "M", h.Mass(r.X), 4*math.Pi*r.Mass, tolerance)
		near(t, "Σ", h.SurfaceDensity(r.X), 2*r.Surface, tolerance)
		near(t, "mean Σ", h.MeanSurfaceDensity(r.X), 2*r.Mean, tolerance)
		near(t, "ΔΣ", h.ExcessSurfaceDensity(r.X), 2*r.Excess, tolerance)
		near(t, "φ", h.Potential(r.X), 4*math.Pi*constants.G*r.Potential, tolerance)
	}
}

// TestOtherExtremes does the same for the other models.
func TestOtherExtremes(t *testing.T) {
	var want struct {
		Rows []struct {
			Model                                string
			Alpha, Beta                          float64
			R                                    float64
			Density, Mass, Surface, Mean, Excess float64
			Potential                            float64
		}
	}
	reads(t, "other_extremes.json", &want)
	seen := map[string]int{}
	for _, r := range want.Rows {
		var m Model
		const tolerance = 1e-12
		switch r.Model {
		case "einasto":
			m = Einasto{RhoS: 1, Rs: 1, Alpha: r.Alpha}
		case "hernquist":
			m = Hernquist{Total: 1, Scale: 1}
		case "beta":
			m = Beta{Rho0: 1, Core: 1, Beta: r.Beta}
		case "cored":
			m = CoredIsothermal{Sigma: math.Sqrt(constants.G), Core: 1}
		}
		seen[r.Model]++
		near(t, r.Model+": ρ", m.Density(r.R), r.Density, tolerance)
		near(t, r.Model+": M", m.Mass(r.R), r.Mass, tolerance)
		near(t, r.Model+": Σ", m.SurfaceDensity(r.R), r.Surface, tolerance)
		near(t, r.Model+": mean Σ", m.MeanSurfaceDensity(r.R), r.Mean, tolerance)
		excess := tolerance
		if r.Model == "einasto" {
			// Where the density is all but constant, ΔΣ is the small difference of
			// numbers of the size of Σ: 1e-14 of Σ is rounding.
			excess = max(tolerance, 1e-14*r.Surface/r.Excess)
		}
		near(t, r.Model+": ΔΣ", m.ExcessSurfaceDensity(r.R), r.Excess, excess)
		near(t, r.Model+": φ", m.Potential(r.R), constants.G*r.Potential, tolerance)
	}
	for _, name := range []string{"einasto", "hernquist", "beta", "cored"} {
		if seen[name] < 10 {
			t.Errorf("%s: %d rows", name, seen[name])
		}
	}
}

type definitions struct {
	Overdensities []struct {
		Z       float64
		Virial  float64 `json:"Delta_vir_c"`
		OfMean  float64 `json:"Delta_vir_m"`
		Mean200 float64 `json:"200m_in_critical_units"`
	}
	Examples []map[string]float64
	Rows     [][]any
}

// named turns "500c" and "vir" into a definition.
func named(t *testing.T, name string) Definition {
	switch name {
	case "vir":
		return Definition{Of: "virial"}
	case "200c", "500c", "2500c", "200m", "180m", "500m":
		of := map[string]string{"c": "critical", "m": "mean"}[name[len(name)-1:]]
		delta := map[string]float64{"200": 200, "500": 500, "2500": 2500, "180": 180}[name[:len(name)-1]]
		return Definition{Delta: delta, Of: of}
	}
	t.Fatalf("no definition %q", name)
	return Definition{}
}

// TestDefinitions converts NFW halos between definitions. Rounding of the root
// finder is the whole error, hence 1e-13.
func TestDefinitions(t *testing.T) {
	var want definitions
	reads(t, "definitions.json", &want)
	if len(want.Rows) != 368 || len(want.Overdensities) != 6 || len(want.Examples) != 3 {
		t.Fatal("definitions.json is not complete")
	}
	c := background(t)
	const tolerance = 1e-13
	for _, o := range want.Overdensities {
		virial, err := Definition{Of: "virial"}.Threshold(c, o.Z)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "Δ_vir", virial/c.CriticalDensity(o.Z), o.Virial, tolerance)
		near(t, "Δ_vir of the mean", virial/c.MeanDensity(o.Z), o.OfMean, tolerance)
		mean, err := Definition{200, "mean"}.Threshold(c, o.Z)
		if err != nil {
			t.Fatal(err)
		}
		near(t, "200 times mean", mean/c.CriticalDensity(o.Z), o.Mean200, tolerance)
	}
	for _, e := range want.Examples {
		z := e["z"]
		h := NewNFW(e["M200c"], e["c200c"], 200*c.CriticalDensity(z))
		for _, name := range []string{"200c", "500c", "2500c", "200m", "vir"} {
			mass, radius, err := Convert(h, named(t, name), c, z)
			if err != nil {
				t.Fatal(err)
			}
			near(t, "M"+name, mass, e["M"+name], tolerance)
			near(t, "R"+name, radius, e["R"+name+"_kpc"], tolerance)
			near(t, "c"+name, radius/h.Rs, e["c"+name], tolerance)
		}
	}
	for _, row := range want.Rows {
		z, from, to := row[0].(float64), named(t, row[1].(string)), named(t, row[2].(string))
		start, err := from.Threshold(c, z)
		if err != nil {
			t.Fatal(err)
		}
		const mass = 5e14
		h := NewNFW(mass, row[3].(float64), start)
		got, radius, err := Convert(h, to, c, z)
		if err != nil {
			t.Fatal(err)
		}
		what := strings.Join([]string{from.String(), to.String()}, " to ")
		near(t, what+": concentration", radius/h.Rs, row[4].(float64), tolerance)
		near(t, what+": mass ratio", got/mass, row[5].(float64), tolerance)
		near(t, what+": radius ratio", radius/(row[3].(float64)*h.Rs), row[6].(float64), tolerance)
		// Hu & Kravtsov 2003 is an approximation, here never worse than 1.3 %.
		near(t, what+": Hu & Kravtsov", row[7].(float64), got/mass, 0.013)
	}
}
