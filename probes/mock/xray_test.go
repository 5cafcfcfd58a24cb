package mock

import (
	"math"
	"math/rand/v2"
	"reflect"
	"slices"
	"testing"

	"steelyard/probes/constants"
)

var (
	gasTruth = Truth{Redshift: 0.212, HubbleConstant: 70, OmegaMatter: 0.3, M200: 8e14, C200: 4.5}
	coolCore = VikhlininGas{N0: 0.006, Rc: 150, Beta: 0.62, Alpha: 0.7, Rs: 1100, Epsilon: 1.5, N02: 0.03, Rc2: 30, Beta2: 1}
)

// The pressure gradient holds up the mass added up from shells,
// dp/dr = −μ(1−f) n M/(H r²), inside the edge and beyond, where a share does.
func TestGasIsAtRest(t *testing.T) {
	a := gasTruth.Atmosphere(Gas{Electrons: coolCore.Electrons, Nonthermal: 0.1, Edge: 1000, Share: 0.7})
	h := gasTruth.Halo()
	pressure := func(r float64) float64 { return coolCore.Electrons(r) * a.Temperature(r) }
	for r, share := range map[float64]float64{5: 1, 50: 1, 300: 1, 980: 1, 1020: 0.7, 3000: 0.7} {
		const step = 1e-3
		gradient := (pressure(r*(1+step)) - pressure(r*(1-step))) / (2 * r * step)
		want := -share * 0.6 * 0.9 * coolCore.Electrons(r) * h.Mass(r) / (constants.HydrostaticMass * r * r)
		// Central differences err by step² times a number of order five.
		if math.Abs(gradient/want-1) > 1e-5 {
			t.Errorf("dp/dr at %g kpc is %.8g, equilibrium wants %.8g", r, gradient, want)
		}
	}
	if in, out := a.Temperature(999.999), a.Temperature(1000.001); math.Abs(in/out-1) > 1e-5 {
		t.Errorf("kT jumps from %g to %g keV at the edge", in, out)
	}
}

// Finer cuts change the projected temperature by no more than is claimed.
func TestSpectralConverges(t *testing.T) {
	a := gasTruth.Atmosphere(Gas{Electrons: coolCore.Electrons})
	for _, c := range []struct{ inner, outer, tolerance float64 }{{0, 60, 2e-4}, {60, 130, 1e-5}, {650, 1000, 1e-5}} {
		got, want := a.Spectral(c.inner, c.outer), a.FineSpectral(c.inner, c.outer)
		if math.Abs(got/want-1) > c.tolerance {
			t.Errorf("%g to %g kpc: %.8g keV, finer cuts give %.8g", c.inner, c.outer, got, want)
		}
	}
}

func TestSpectraAreRepeatable(t *testing.T) {
	s := Spectra{DensityEdges: []float64{0, 1, 2, 4}, DensityError: 0.05, TemperatureEdges: []float64{0, 2, 4}, TemperatureErrors: []float64{0.05, 0.1}}
	g := Gas{Electrons: coolCore.Electrons}
	a := gasTruth.Spectra(g, s, rand.New(rand.NewPCG(1, 2)))
	if !reflect.DeepEqual(a, gasTruth.Spectra(g, s, rand.New(rand.NewPCG(1, 2)))) {
		t.Error("the same stream gives other profiles")
	}
	if reflect.DeepEqual(a, gasTruth.Spectra(g, s, rand.New(rand.NewPCG(1, 3)))) {
		t.Error("another stream gives the same profiles")
	}
}

// The noise has the size of the errors, on each side and with the scatter.
func TestNoiseOfSpectra(t *testing.T) {
	s := Spectra{
		DensityEdges: []float64{1, 2}, DensityError: 0.05, TemperatureEdges: []float64{1, 2, 3}, TemperatureErrors: []float64{0.05, 0.1},
		Skew: 0.3, Scale: 1.1, Scatter: 0.04,
	}
	g := Gas{Electrons: coolCore.Electrons}
	exact := gasTruth.Spectra(g, s, nil)
	a := gasTruth.Atmosphere(g)
	kpc := gasTruth.AngularDiameter(gasTruth.Redshift) * math.Pi / 180 / 60
	if got, want := exact.Temperature[0], a.Spectral(kpc, 2*kpc)/1.1; math.Abs(got/want-1) > 1e-12 {
		t.Errorf("kT without noise %g, want %g", got, want)
	}
	rng := rand.New(rand.NewPCG(5, 6))
	const n = 4000
	var density, below, above, lower float64
	for range n {
		d := &SpectraData{
			Density: slices.Clone(exact.Density), DensityError: exact.DensityError,
			Temperature: slices.Clone(exact.Temperature), TemperatureErrorMinus: exact.TemperatureErrorMinus, TemperatureErrorPlus: exact.TemperatureErrorPlus,
		}
		d.addNoise(s.Scatter, rng)
		density += math.Pow((d.Density[0]-exact.Density[0])/d.DensityError[0], 2)
		for i := range d.Temperature {
			x := d.Temperature[i] - exact.Temperature[i]
			extra := 0.04 * exact.Temperature[i]
			// The truth above the datum is judged by the datum's upper error.
			if x < 0 {
				below += x * x / (math.Pow(d.TemperatureErrorPlus[i], 2) + extra*extra)
				lower++
			} else {
				above += x * x / (math.Pow(d.TemperatureErrorMinus[i], 2) + extra*extra)
			}
		}
	}
	// Means of squared unit normals: good to √(2/n), 0.022; three of those.
	for name, got := range map[string]float64{"density": density / n, "below": below / lower, "above": above / (2*n - lower)} {
		if math.Abs(got-1) > 0.067 {
			t.Errorf("%s: noise over error squared is %.2f", name, got)
		}
	}
}
