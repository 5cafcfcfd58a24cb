package xray

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"steelyard/probes/catalogue"
	"steelyard/probes/estimate"
	"steelyard/probes/method"
	"steelyard/probes/mock"
	"steelyard/probes/prior"
)

// The emission of the reference cluster in its annuli.
func TestProjectedEmissionReference(t *testing.T) {
	ref, gas := readReference(t)
	annuli := new(Bins)
	for _, a := range ref.Annuli {
		annuli.Inner, annuli.Outer, annuli.Value = append(annuli.Inner, a.Inner), append(annuli.Outer, a.Outer), append(annuli.Value, 1)
	}
	out := make([]float64, annuli.Len())
	projected(ModifiedBeta, annuli)(append(append([]float64(nil), gas.Parameters...), 0), out)
	for i, a := range ref.Annuli {
		area := math.Pi * (a.Outer*a.Outer - a.Inner*a.Inner)
		// n² over the reference is followed by polynomials of degree five.
		near(t, fmt.Sprintf("emission between %g and %g kpc", a.Inner, a.Outer), out[i]*area, a.EmissionMeasure, 2e-6)
	}
}

// bright is a task with the surface brightness of the gas in counts: emission
// measures over the factor, on a background, with errors of 3%.
func bright(t testing.TB, gas mock.VikhlininGas, factor, background float64, rng *rand.Rand, settings method.Settings) *estimate.Task {
	edges := edgesBetween(15, 1800, 40, true)
	known := gasOf(gas)
	annuli := &Bins{Inner: edges[:40], Outer: edges[1:], Value: make([]float64, 40)}
	counts, errors := make([]float64, 40), make([]float64, 40)
	projected(ModifiedBeta, annuli)(append(append([]float64(nil), known.Parameters...), background*factor), counts)
	for i := range counts {
		counts[i] /= factor
		errors[i] = 0.03 * counts[i]
		if rng != nil {
			counts[i] += errors[i] * rng.NormFloat64()
		}
	}
	settings["emission_measure_per_count"] = method.Exactly(factor)
	return &estimate.Task{
		Name: "xray.a", Object: estimate.Object{Redshift: 0.2}, Cosmology: flat(t, 70, 0.3),
		Tables: map[string]*catalogue.Table{"surface_brightness": table("sx.csv", column("inner", "kpc", annuli.Inner), column("outer", "kpc", annuli.Outer),
			column("value", "", counts), column("error", "", errors))},
		Blocks: map[string]method.Settings{"surface_brightness": settings},
	}
}

// The density comes back from its brightness, the background known, or fitted.
func TestBrightnessRecovered(t *testing.T) {
	plain := mock.VikhlininGas{N0: 0.006, Rc: 140, Beta: 0.6, Alpha: 0.7, Rs: 1200, Epsilon: 1.5, Rc2: 1}
	for _, c := range []struct {
		name      string
		stated    method.Value
		noise     *rand.Rand
		tolerance float64
	}{
		// Without noise what the priors of the form pull remains.
		{"exact", method.Exactly(0.02), nil, 0.01},
		{"fitted", must(prior.Normal(0.025, 0.01)), nil, 0.02},
		{"noisy", must(prior.Normal(0.025, 0.01)), rand.New(rand.NewPCG(1, 9)), 0.1},
	} {
		task := bright(t, plain, 2e-3, 0.02, c.noise, method.Settings{"background": c.stated})
		out, err := reduceDensity(context.Background(), task)
		if err != nil {
			t.Fatal(c.name, err)
		}
		g := out.(*Gas)
		if len(g.Parameters) != len(ModifiedBeta.parameters()) {
			t.Fatalf("%s: %d parameters", c.name, len(g.Parameters))
		}
		for _, r := range []float64{20, 100, 400, 900} {
			near(t, fmt.Sprintf("%s: n_e at %g kpc", c.name, r), math.Exp(g.LnElectrons(r)), plain.Electrons(r), c.tolerance)
			if off := math.Abs(g.LnElectrons(r)-math.Log(plain.Electrons(r))) / g.deviation(r); off > 3 {
				t.Errorf("%s: n_e at %g kpc is off by %.1f of its errors", c.name, r, off)
			}
		}
		if !strings.Contains(g.Words, "fitted to 40 annuli of surface brightness") {
			t.Errorf("%s: %q", c.name, g.Words)
		}
	}
}

// A background that is only roughly known widens the error of the outer gas.
func TestBackgroundErrorReachesTheDensity(t *testing.T) {
	plain := mock.VikhlininGas{N0: 0.006, Rc: 140, Beta: 0.6, Alpha: 0.7, Rs: 1200, Epsilon: 1.5, Rc2: 1}
	deviation := func(background method.Value) float64 {
		out, err := reduceDensity(context.Background(), bright(t, plain, 2e-3, 0.02, nil, method.Settings{"background": background}))
		if err != nil {
			t.Fatal(err)
		}
		return out.(*Gas).deviation(1500)
	}
	if known, rough := deviation(method.Exactly(0.02)), deviation(must(prior.Normal(0.02, 0.02))); rough < 1.2*known {
		t.Errorf("error of ln n_e at 1.5 Mpc: %.4f with the background known, %.4f with it fitted", known, rough)
	}
}

func TestFaultyBrightness(t *testing.T) {
	plain := mock.VikhlininGas{N0: 0.006, Rc: 140, Beta: 0.6, Rs: 1, Rc2: 1}
	for name, c := range map[string]struct {
		spoil func(*estimate.Task)
		want  string
	}{
		"no conversion": {func(k *estimate.Task) { delete(k.Blocks["surface_brightness"], "emission_measure_per_count") }, "needs emission_measure_per_count"},
		"wrong conversion": {func(k *estimate.Task) {
			k.Blocks["surface_brightness"]["emission_measure_per_count"] = method.Exactly(1e9)
		}, "is emission_measure_per_count right?"},
		"two densities": {func(k *estimate.Task) { k.Blocks["density"] = method.Settings{} }, "both a density and a surface brightness"},
		"three annuli":  {func(k *estimate.Task) { truncate(k.Tables["surface_brightness"], 0, 3) }, "needs at least 4"},
	} {
		task := bright(t, plain, 2e-3, 0, nil, method.Settings{})
		c.spoil(task)
		if _, err := reduceDensity(context.Background(), task); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q", name, err, c.want)
		}
	}
}
