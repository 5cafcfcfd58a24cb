package xray

import (
	"encoding/json"
	"math"
	"os"
	"testing"
)

// reference is the invented cluster of testdata/xray/cluster.json, which names
// its source.
type reference struct {
	Density       map[string]float64
	Temperature   map[string]float64
	Profile       []referenceRow
	Overdensities []struct {
		Delta, R, Mass float64
		GasMass        float64 `json:"gas_mass"`
	}
	Annuli []struct {
		Inner, Outer, KT float64
		EmissionMeasure  float64 `json:"emission_measure"`
	}
	Lines []struct {
		R, KT           float64
		EmissionMeasure float64 `json:"emission_measure"`
	}
}

type referenceRow struct {
	R, KT, Mass      float64
	Electrons        float64 `json:"n_e"`
	GasMass          float64 `json:"gas_mass"`
	DensitySlope     float64 `json:"density_slope"`
	TemperatureSlope float64 `json:"temperature_slope"`
}

func readJSON(t testing.TB, name string, into any) {
	t.Helper()
	data, err := os.ReadFile("../../testdata/xray/" + name)
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(data, into); err != nil {
		t.Fatal(err)
	}
}

func readReference(t testing.TB) (r reference, gas *Gas) {
	readJSON(t, "cluster.json", &r)
	gas = &Gas{Form: ModifiedBeta}
	r.Density["gamma"] = 3
	for _, p := range ModifiedBeta.parameters() {
		gas.Parameters = append(gas.Parameters, r.Density[p.name])
	}
	return r, gas
}

// near fails unless got is want to a fraction tolerance.
func near(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance*math.Abs(want)) {
		t.Errorf("%s: got %.12g, want %.12g, off by %.1e of it (allowed %.0e)", what, got, want, got/want-1, tolerance)
	}
}

// kT is the temperature of the reference cluster (Vikhlinin et al. 2006, eq. 6).
func (c reference) kT(r float64) float64 {
	p := c.Temperature
	x := math.Pow(r/p["rcool"], p["acool"])
	return p["T0"] * math.Pow(r/p["rt"], -p["a"]) / math.Pow(1+math.Pow(r/p["rt"], p["b"]), p["c"]/p["b"]) * (x + p["Tmin"]) / (x + 1)
}
