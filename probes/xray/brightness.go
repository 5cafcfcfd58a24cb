package xray

import (
	"math"
	"slices"

	"steelyard/probes/estimate"
)

// brightness names the quantity in messages.
const brightness = "surface brightness"

// reduceBrightness reads annuli of surface brightness and fits the form of a
// density to them, projected, with the background.
func reduceBrightness(t *estimate.Task) (*Gas, error) {
	annuli, err := readBins(t, "surface_brightness", brightness)
	if err != nil {
		return nil, err
	}
	file, block := t.Tables["surface_brightness"].File, t.Blocks["surface_brightness"]
	if annuli.Len() < 4 {
		return nil, t.Errorf("%s: %d annuli of surface brightness; a density needs at least 4", file, annuli.Len())
	}
	factor := block["emission_measure_per_count"]
	if !factor.Set || !(factor.Prior.A > 0) {
		return nil, t.Errorf("the surface brightness needs emission_measure_per_count, a positive emission measure in cm**-6 kpc")
	}
	for _, v := range [][]float64{annuli.Value, annuli.Minus, annuli.Plus} {
		for i := range v {
			v[i] *= factor.Prior.A
		}
	}
	background := coordinate{bounded: linear}
	if v := block["background"]; v.Set {
		background.mean = v.Prior.Median() * factor.Prior.A
		if !v.Prior.IsExact() {
			background.sd = spread(v.Prior) * factor.Prior.A
		}
	}
	gas, err := ofBrightness(annuli, background).fit(Form(block["model"].Text))
	if err != nil {
		return nil, t.Errorf("%s: %w", file, err)
	}
	for _, r := range []float64{gas.Inner + gas.Outer/10, gas.Outer} {
		if n := math.Exp(gas.LnElectrons(r)); n < leastDensity || n > mostDensity {
			return nil, t.Errorf("%s: the surface brightness comes to an electron density of %.2g cm**-3 at %.4g kpc, which is not that of a cluster's gas; is emission_measure_per_count right?", file, n, r)
		}
	}
	return gas, nil
}

// ofBrightness is the density known from emission measures ∫ n_e n_p dl in
// cm⁻⁶ kpc, the mean over each annulus.
func ofBrightness(annuli *Bins, background coordinate) density {
	d := density{data: annuli, words: "annuli of surface brightness", background: background}
	// A first guess: all of the light comes from a depth of twice the radius.
	guess := &Bins{Inner: annuli.Inner, Outer: annuli.Outer, Value: slices.Clone(annuli.Value)}
	for i, v := range annuli.Value {
		depth := annuli.Inner[i] + annuli.Outer[i]
		guess.Value[i] = math.Sqrt(math.Max(v-background.mean, annuli.Plus[i]) / depth)
	}
	d.shells = guess
	d.predict = func(f Form) func(p, out []float64) { return projected(f, annuli) }
	return d
}

// projected returns a function that fills out with the mean emission measure of
// every annulus, background included: the last of p.
func projected(form Form, annuli *Bins) func(p, out []float64) {
	inner := annuli.Inner[0]
	if inner == 0 {
		inner = annuli.Outer[0]
	}
	// Twice the usual nodes: n² itself is interpolated here, over a reference that
	// falls as a cluster's does.
	g := newRadial(inner, annuli.Outer[annuli.Len()-1], 2*nodesPerEfold)
	reference := func(r float64) float64 { return math.Pow(r*r+inner*inner, -2) }
	var bins []seen
	for i, r1 := range annuli.Inner {
		r2 := annuli.Outer[i]
		w := g.annulus(r1, r2, reference)
		area := math.Pi * (r2*r2 - r1*r1)
		for j, r := range g.r {
			w[j] /= reference(r) * area * electronsPerProton
		}
		bins = append(bins, sparse(w))
	}
	square := make([]float64, len(g.r))
	return func(p, out []float64) {
		for j, r := range g.r {
			square[j] = math.Exp(2 * form.lnElectrons(p, r))
		}
		for i, b := range bins {
			out[i] = p[len(p)-1]
			for j, w := range b.weight {
				out[i] += w * square[b.first+j]
			}
		}
	}
}
