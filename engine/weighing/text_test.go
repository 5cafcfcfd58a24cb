package weighing

import (
	"bytes"
	"strings"
	"testing"
)

// threeProbes is a weighing of three probes at two radii, one of them apart.
func threeProbes() *Weighing {
	names := []string{"xray.gas.backward", "lensing.shapes.nfw", "dynamics.motions.jeans"}
	mass := Interval{5e14, 4.5e14, 5.6e14}
	w := &Weighing{Object: Object{"Knot", 0.2}, Cosmology: Cosmology{HubbleConstant: 70, OmegaMatter: 0.3, OmegaLambda: 0.7}, RadiiFrom: names[1]}
	for i, n := range names {
		e := Estimate{Name: n, Draws: 4000}
		for _, delta := range []float64{2500, 500, 200} {
			e.Own = append(e.Own, Own{Overdensity: delta, Of: "critical", Radius: Interval{1000, 950, 1060}, Mass: mass})
		}
		for j, at := range []string{"overdensity 500", "radius 700 kpc"} {
			e.At = append(e.At, At{At: at, Radius: 1000 - 300*float64(j), Mass: mass, Extrapolated: i == 2})
		}
		w.Estimates = append(w.Estimates, e)
	}
	for _, at := range []string{"overdensity 500", "radius 700 kpc"} {
		for _, p := range [][2]int{{0, 1}, {0, 2}, {1, 2}} {
			w.Tensions = append(w.Tensions, Tension{At: at, A: names[p[0]], B: names[p[1]], Radii: "matched", Ratio: Interval{0.7, 0.6, 0.81}, Sigma: -2.1 - float64(p[0]), PValue: 0.002, PFamily: 0.01})
		}
		w.Consistency = append(w.Consistency, Consistency{
			At: at, Chi2: 12.1, Dof: 2, PValue: 0.002, Sigma: 3.1, Verdict: "in tension", Of: names,
			Without:  map[string]float64{names[0]: 3.1, names[1]: 2.4, names[2]: 0.4},
			Evidence: &Evidence{LnBayes: -1.2, Prior: "each mass flat"}, Given: []string{"no hydrostatic bias (xray.gas.backward)"},
		})
		w.Combined = append(w.Combined, Combined{At: at, Mass: mass, Weights: map[string]float64{names[0]: 0.7, names[1]: 0.4, names[2]: -0.1}})
	}
	value, sd, all, chi2 := 1.12, 3.0, 1.4, 0.3
	w.Levers = []Lever{
		{At: "overdensity 500", A: names[1], B: names[2], Assumption: "nuisance.temperature_scale", Present: 1, Value: &value, InPriorSD: &sd, Sigma: &all, All: &all, Chi2: &chi2},
		{At: "overdensity 500", A: names[1], B: names[2], Assumption: "lensing.shapes.nfw.dilution", Cannot: "it would have to lie beyond its limits"},
	}
	return w
}

// The reader learns within thirty lines, and first of all, who disagrees with
// whom, where, by how much, how surely, who drives it, and what would repair it.
func TestTextSaysWhatMatters(t *testing.T) {
	var b bytes.Buffer
	if err := threeProbes().WriteText(&b); err != nil {
		t.Fatal(err)
	}
	text := b.String()
	lines := strings.Split(text, "\n")
	if !strings.Contains(lines[2], "IN TENSION: the three masses do not agree, 3.1σ within 1000 kpc, 3.1σ within 700 kpc.") {
		t.Errorf("the verdict does not come first:\n%s", text)
	}
	flat := strings.Join(strings.Fields(text), " ")
	for _, want := range []string{
		"lensing.shapes.nfw is 0.70 +0.11 -0.10 times dynamics.motions.jeans within 1000 kpc, 3.1σ (p = 0.0020; 0.010 that any of these 6 ratios is so by chance)",
		"dynamics.motions.jeans stands against the others: 3.1σ without xray.gas.backward, 2.4σ without lensing.shapes.nfw, 0.4σ without dynamics.motions.jeans.",
		"favours a mass for each over one mass for all by e^1.2",
		"Given no hydrostatic bias (xray.gas.backward).",
		"1000 kpc is R_500 of lensing.shapes.nfw",
		"NEGATIVE WEIGHT of dynamics.motions.jeans",
		"nuisance.temperature_scale 1 1.12 +3.0 +0.3 1.4σ",
		"Cannot: lensing.shapes.nfw.dilution",
	} {
		if !strings.Contains(flat, want) {
			t.Errorf("%q is missing from\n%s", want, text)
		}
	}
	for i, line := range lines {
		if strings.HasPrefix(line, "What would bring") && i > 36 {
			t.Errorf("the comparison takes %d lines", i)
		}
	}
}

// Estimates that cannot be believed are marked wherever they count.
func TestTextMarksDoubt(t *testing.T) {
	w := threeProbes()
	w.Tensions[0].Doubtful = []string{"xray.gas.backward is poorly fitted"}
	w.Consistency[0].Doubtful = w.Tensions[0].Doubtful
	var b bytes.Buffer
	if err := w.WriteText(&b); err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{"-2.1†", "3.1†", "† Doubtful: xray.gas.backward is poorly fitted."} {
		if !strings.Contains(b.String(), want) {
			t.Errorf("%q is missing from\n%s", want, b.String())
		}
	}
}
