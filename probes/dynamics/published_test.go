package dynamics

import (
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"testing"
)

// published reads one file of ../../testdata/dynamics, each of which names its
// source.
func published(t testing.TB, name string, into any) {
	t.Helper()
	data, err := os.ReadFile(filepath.Join("..", "..", "testdata", "dynamics", name))
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(data, into); err != nil {
		t.Fatalf("%s: %v", name, err)
	}
}

// near fails unless got is within the relative tolerance of want.
func near(t testing.TB, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance*math.Abs(want)) {
		t.Errorf("%s = %.16g, want %.16g (off by %.2g)", what, got, want, got/want-1)
	}
}

// The tolerances of 1e-10 are those of the reference figures; what is left is
// rounding.

func TestRobustEstimators(t *testing.T) {
	var file struct {
		Rows []struct {
			Name             string
			Data             []float64
			BiweightLocation float64 `json:"biweight_location"`
			BiweightScale    float64 `json:"biweight_scale"`
			Gapper, Standard float64
			Median, Mad      float64
			AndersonDarling  float64 `json:"anderson_darling"`
			Skewness         float64
			SkewP            float64 `json:"skew_p"`
		}
		Restframe struct {
			Zbar      float64
			Sigma     float64 `json:"sigma_rest_biweight"`
			Error     float64 `json:"per_galaxy_error_cz_km_s"`
			Corrected float64 `json:"sigma_rest_error_corrected"`
		}
	}
	published(t, "robust.json", &file)
	if len(file.Rows) != 4 {
		t.Fatalf("%d rows", len(file.Rows))
	}
	for _, r := range file.Rows {
		near(t, r.Name+": biweight location", BiweightLocation(r.Data), r.BiweightLocation, 1e-10)
		near(t, r.Name+": biweight scale", BiweightScale(r.Data), r.BiweightScale, 1e-10)
		near(t, r.Name+": gapper", Gapper(r.Data), r.Gapper, 1e-10)
		near(t, r.Name+": standard deviation", StandardDeviation(r.Data), r.Standard, 1e-10)
		v := sorted(r.Data)
		near(t, r.Name+": median", median(v, nil), r.Median, 1e-14)
		near(t, r.Name+": MAD", deviation(v, nil, r.Median), r.Mad, 1e-13)
		a2, _ := AndersonDarling(r.Data)
		near(t, r.Name+": Anderson-Darling", a2, r.AndersonDarling, 1e-10)
		g1, p := Skewness(r.Data)
		near(t, r.Name+": skewness", g1, r.Skewness, 1e-10)
		near(t, r.Name+": p of skewness", p, r.SkewP, 1e-8) // scipy's own rounding of a tail
	}
	// The first sample as velocities cz: v = c(z − z̄)/(1 + z̄) divides by 1 + z̄,
	// and the error of 60 km/s in cz becomes 60/(1+z̄).
	rest := file.Restframe
	var v []float64
	for _, cz := range file.Rows[0].Data {
		v = append(v, velocity(cz/299792.458, rest.Zbar))
	}
	sigma := BiweightScale(v)
	near(t, "dispersion in the cluster's frame", sigma, rest.Sigma, 1e-10)
	s := sample{noise: rest.Error / (1 + rest.Zbar)}
	near(t, "dispersion without redshift errors", s.intrinsic(sigma), rest.Corrected, 1e-10)
}

func TestScalingRelations(t *testing.T) {
	var file struct{ Rows []map[string]float64 }
	published(t, "relations.json", &file)
	columns := []struct{ key, name, tracer string }{
		{"M200c_Evrard2008_DM", "evrard-2008", "dark-matter"},
		{"M200c_Munari2013_DM", "munari-2013", "dark-matter"},
		{"M200c_Munari2013_subhaloes_AGN", "munari-2013", "subhaloes"},
		{"M200c_Munari2013_galaxies_AGN", "munari-2013", "galaxies"},
	}
	for _, row := range file.Rows {
		for _, c := range columns {
			want, ok := row[c.key]
			if !ok {
				t.Fatalf("no column %s", c.key)
			}
			r, err := findRelation(c.name, c.tracer)
			if err != nil {
				t.Fatal(err)
			}
			near(t, c.key, r.mass(row["sigma"], row["h(z)=H(z)/100"]), want, 1e-10)
		}
	}
}

func TestVirialAndProjectedMass(t *testing.T) {
	var file struct {
		XYV          [][3]float64
		Sigma        float64
		VirialRadius float64 `json:"virial_radius"`
		VirialMass   float64 `json:"virial_mass"`
		Isotropic    float64 `json:"projected_isotropic"`
		Radial       float64 `json:"projected_radial"`
	}
	published(t, "estimators.json", &file)
	var galaxies []Galaxy
	var v, r []float64
	for _, row := range file.XYV {
		r = append(r, math.Hypot(row[0], row[1]))
		galaxies = append(galaxies, Galaxy{East: row[0], North: row[1], Weight: 1})
		v = append(v, row[2])
	}
	sigma, p := StandardDeviation(v), virialRadius(galaxies)
	near(t, "σ", sigma, file.Sigma, 1e-10)
	near(t, "R_PV", p.radius, file.VirialRadius, 1e-10)
	near(t, "virial mass", VirialMass(sigma, p.radius), file.VirialMass, 1e-10)
	mean, _ := meanAndSpread(v, nil)
	for i := range v {
		v[i] -= mean
	}
	near(t, "projected mass, isotropic", ProjectedMass(v, r, 0), file.Isotropic, 1e-10)
	near(t, "projected mass, radial", ProjectedMass(v, r, 1), file.Radial, 1e-10)
}

func TestIsotropicHaloKinematics(t *testing.T) {
	var file struct {
		Halo   map[string]float64
		SigmaR []struct {
			X     float64 `json:"r_over_rs"`
			Sigma float64 `json:"sigma_r_beta0"`
		} `json:"sigma_r"`
		SigmaLOS []struct {
			X     float64 `json:"R_over_rs"`
			Sigma float64 `json:"sigma_los_beta0"`
		} `json:"sigma_los"`
		Aperture []struct {
			X     float64 `json:"R_over_rs"`
			Sigma float64 `json:"sigma_ap_beta0"`
		} `json:"sigma_aperture"`
	}
	published(t, "jeans.json", &file)
	if len(file.SigmaR) != 7 || len(file.SigmaLOS) != 7 || len(file.Aperture) != 2 {
		t.Fatal("rows are missing")
	}
	v2 := file.Halo["G M_s/rs = V0^2"]
	for _, r := range file.SigmaR {
		near(t, "σ_r", math.Sqrt(v2*radialVariance(r.X)), r.Sigma, 1e-10)
	}
	for _, r := range file.SigmaLOS {
		near(t, "σ_los", math.Sqrt(v2*lineOfSightVariance(r.X)), r.Sigma, 1e-10)
		// The tables are read by cubics over steps of 0.1 in ln x.
		near(t, "σ_los from the table", math.Sqrt(v2*losTable().at(math.Log(r.X))), r.Sigma, 1e-7)
	}
	for _, r := range file.Aperture {
		near(t, "σ in an aperture", math.Sqrt(v2*apertureTable().at(math.Log(r.X))), r.Sigma, 1e-6)
	}
}

// The virial theorem of a sphere with its surface term, against the direct sum
// of 4πr²ρσ_r² and the closed form of the potential term.
func TestVirialTermsOfTheSphere(t *testing.T) {
	for _, x := range []float64{0.1, 1, 5, 20} {
		direct := 0.0
		const steps = 400
		for k := range steps {
			r := x * (float64(k) + 0.5) / steps
			direct += 3 * 4 * math.Pi * r * r * unit.Density(r) * radialVariance(r) * x / steps
		}
		surface, potential := virialTerms(x)
		near(t, "∫ρ⟨v²⟩", surface+potential, direct, 1e-3) // the midpoint rule's error at the cusp
		near(t, "−W", potential, 0.5-math.Log(1+x)/(1+x)-0.5/((1+x)*(1+x)), 1e-11)
		near(t, "σ² of the sphere", sphereVariance(x), direct/3/unit.Mass(x), 1e-3)
		near(t, "share inside", pressureTable().at(math.Log(x)), potential/(surface+potential), 1e-6)
	}
}
