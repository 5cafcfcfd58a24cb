package constants

import (
	"encoding/json"
	"math"
	"os"
	"testing"
)

// TestDerived holds the derived constants to numbers computed elsewhere with 30
// digits. Both sides carry 16 digits, so 1e-15 is rounding alone.
func TestDerived(t *testing.T) {
	data, err := os.ReadFile("../../testdata/constants/derived.json")
	if err != nil {
		t.Fatal(err)
	}
	var want struct {
		Sun      float64 `json:"Msun_kg"`
		Parsec   float64 `json:"pc_m"`
		Kpc      float64 `json:"kpc_m"`
		G        float64 `json:"G_kpc_km2_s2_per_Msun"`
		Lensing  float64 `json:"c2_over_4piG_Msun_per_kpc"`
		Hydro    float64 `json:"kpc_keV_over_G_mp_Msun"`
		Hubble70 float64 `json:"1_over_H0_Gyr_for_H0_70"`
	}
	if err := json.Unmarshal(data, &want); err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		name      string
		got, want float64
	}{
		{"solar mass, kg", SolarMassKilogram, want.Sun},
		{"parsec, m", ParsecMetre, want.Parsec},
		{"kiloparsec, m", KiloparsecMetre, want.Kpc},
		{"G", G, want.G},
		{"c²/4πG", LensingMass, want.Lensing},
		{"keV kpc/(G m_p)", HydrostaticMass, want.Hydro},
		{"1/H0 of 70 km/s/Mpc, Gyr", SecondsPerHubble / 70.0 / Gigayear, want.Hubble70},
		// Typed in from the SI Brochure (2019): σ_SB = 2π⁵k⁴/(15h³c²) of the
		// exact k, h and c. Ten digits are kept.
		{"σ_SB", StefanBoltzmannSI, 2 * math.Pow(math.Pi, 5) * math.Pow(1.380649e-23, 4) / (15 * math.Pow(6.62607015e-34, 3) * 299792458 * 299792458)},
	} {
		tolerance := 1e-15
		if c.name == "σ_SB" {
			tolerance = 1e-10
		}
		if !(math.Abs(c.got/c.want-1) <= tolerance) {
			t.Errorf("%s = %.16g, want %.16g", c.name, c.got, c.want)
		}
	}
}

// TestProtonDensity checks ProtonMassPerCubicKpc by another route: a density of
// one proton per cm³ is 1.6726e-24 g/cm³ = 0.0247 Msun/pc³.
func TestProtonDensity(t *testing.T) {
	perCubicParsec := ProtonMassKilogram / SolarMassKilogram * math.Pow(100*ParsecMetre, 3)
	if got := ProtonMassPerCubicKpc / 1e9 / perCubicParsec; math.Abs(got-1) > 1e-14 {
		t.Errorf("a kpc³ holds %g times 1e9 pc³", got)
	}
	if math.Abs(perCubicParsec-0.0247) > 0.00005 { // astropy 5.2.1: (m_p/cm³).to(Msun/pc³) = 0.02471
		t.Errorf("one proton per cm³ is %g Msun/pc³", perCubicParsec)
	}
}
