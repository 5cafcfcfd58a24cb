package lensing

import (
	"math"
	"strings"
	"testing"

	"steelyard/probes/halo"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// TestModes adds a change of all shears by hand and as a mode.
func TestModes(t *testing.T) {
	p := &Profile{Bins: []Bin{{Shear: 0.2, Minus: 0.02, Plus: 0.02}, {Shear: 0.1, Minus: 0.01, Plus: 0.01}}}
	mode := []float64{0.03, 0.01}
	expected := []float64{0.25, 0.09}
	ln, chi2 := newMeasure(p, nil).compare(expected, mode)
	byHand := []float64{4e-4 + 9e-4, 3e-4, 3e-4, 1e-4 + 1e-4}
	q := &Profile{Bins: p.Bins, Covariance: byHand}
	wantLn, wantChi2 := newMeasure(q, nil).compare(expected)
	near(t, "χ²", chi2, wantChi2, 1e-12) // rounding
	near(t, "ln of the likelihood", ln, wantLn, 1e-12)
	if _, chi2 := newMeasure(&Profile{Bins: p.Bins, Covariance: []float64{1, 2, 2, 1}}, nil).compare(expected); !math.IsInf(chi2, 1) {
		t.Errorf("χ² = %g with a covariance that is none", chi2)
	}
}

// deepProfile is a profile without scatter of ten bins about a lens at z = 0.25,
// with the shape noise of 30 sources an arcmin² of dispersion 0.25.
func deepProfile(t testing.TB, m halo.Model) *Profile {
	c := background(t)
	b := newEfficiencies(c, 0.25, 0).exact(1)
	perArcmin := 60 * c.KpcPerArcsec(0.25)
	p := new(Profile)
	edges, err := binEdges(logBins(300, 5000, 10))
	if err != nil {
		t.Fatal(err)
	}
	for i := range 10 {
		lo, hi := edges[i], edges[i+1]
		n := 30 * math.Pi * (hi*hi - lo*lo) / (perArcmin * perArcmin)
		sigma := 0.25 / math.Sqrt(n)
		p.Bins = append(p.Bins, Bin{Inner: lo, Outer: hi, Minus: sigma, Plus: sigma, Beta: b, Beta2: b * b, Nodes: areaNodes(lo, hi, areaCount(lo, hi))})
	}
	s := signal{critical: c.SigmaCritical(0.25, math.Inf(1)), bins: p.Bins, elongation: 1, distance: 1, response: 1}
	g := make([]float64, 10)
	s.predict(m, g)
	for i := range g {
		p.Bins[i].Shear = g[i]
	}
	return p
}

// TestTerms switches the sources of error on one by one.
func TestTerms(t *testing.T) {
	const mass = 1e15
	profile := deepProfile(t, halo.NewNFW(mass, 4, 200*background(t).CriticalDensity(0.25)))
	data, err := profile.MarshalBinary()
	if err != nil {
		t.Fatal(err)
	}
	width := func(change func(method.Settings), says string) float64 {
		task := profileTask(t)
		task.Settings = defaults(tangentialShear)
		task.Settings["concentration"] = method.Exactly(4)
		task.Reduced = map[string][]byte{"profile": data}
		task.Sampling.Stream = infer.NewStream("terms")
		change(task.Settings)
		d, err := tangentialShear.Run(t.Context(), task)
		if err != nil {
			t.Fatal(err)
		}
		if a := strings.Join(d.Assumes, "\n"); !strings.Contains(a, says) {
			t.Errorf("assumes %q, without %q", a, says)
		}
		m := infer.Percentiles(parameter(t, d, "mass_200c"), 16, 50, 84)
		// The mean of data without scatter is the truth, to the asymmetry of a wide
		// posterior in ln M.
		if off := math.Abs(math.Log(m[1] / mass)); off > 0.2*math.Log(m[2]/m[0])+0.01 {
			t.Errorf("%s: median mass %.4g", says, m[1])
		}
		return math.Log(m[2]/m[0]) / 2
	}
	terms := func(names ...string) func(method.Settings) {
		return func(s method.Settings) { s["covariance"] = method.Words(names...) }
	}
	shape := width(terms("shape"), "shape noise alone; left out: structure along the line of sight, the variety of haloes")
	structured := width(terms("shape", "structure"), "structure along the line of sight to z = 1.00 (σ_8 = 0.811); left out: the variety of haloes")
	// For deep data of one cluster structure makes the error of the mass about
	// twice that of shape noise (Hoekstra 2003, abstract; from memory).
	if r := structured / shape; !(r > 1.3 && r < 2.7) {
		t.Errorf("structure multiplies the error by %.2f", r)
	}
	t.Logf("error of ln M_200c: %.4f by shape noise, %.4f with structure", shape, structured)

	// A drawn elongation of 0.13 is the orientation's part, in first order.
	oriented := width(terms("shape", "halo"), "in orientation (0.13 in ln of the projected mass) and in concentration")
	byDraw := width(func(s method.Settings) {
		s["elongation"] = method.Distributed(prior.LogNormal(1, 0.13))
	}, "elongation: lognormal")
	concentrated := width(func(s method.Settings) {
		s["concentration"] = method.Distributed(prior.LogNormal(4, 0.346))
		s["elongation"] = method.Distributed(prior.LogNormal(1, 0.13))
	}, "elongation: lognormal")
	// Of 0.35 in ln c the second order is a tenth of the first.
	near(t, "error by orientation and concentration", oriented, concentrated, 0.15)
	both := width(func(s method.Settings) {
		terms("shape", "halo")(s)
		s["concentration"] = method.Distributed(prior.LogNormal(4, 0.01)) // drawn: no part of its own
	}, "in orientation (0.13 in ln of the projected mass)")
	near(t, "error by orientation", both, byDraw, 0.05)
	none := width(func(s method.Settings) {
		terms("shape", "halo")(s)
		s["concentration"] = method.Distributed(prior.LogNormal(4, 0.01))
		s["elongation"] = method.Distributed(prior.LogNormal(1, 0.01))
	}, "the variety of haloes by what is drawn")
	if none > 1.1*shape {
		t.Errorf("the error is %.4f although orientation and concentration are drawn, %.4f by shape noise", none, shape)
	}
}

func BenchmarkFitAllTerms(b *testing.B) {
	s := defaults(tangentialShear)
	s["covariance"] = method.Words("shape", "structure", "halo")
	benchmarkFit(b, s)
}
