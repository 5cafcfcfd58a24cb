package lensing

import (
	"context"
	"encoding/json"
	"math"
	"os"
	"strings"
	"testing"

	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// finely is a profile without noise of a halo between lo and hi in many bins,
// its sources at redshift 1.
func finely(t testing.TB, m halo.Model, edges []float64, sigma float64) *Profile {
	c := background(t)
	b := newEfficiencies(c, 0.25, 0).exact(1)
	p := new(Profile)
	for i := 1; i < len(edges); i++ {
		p.Bins = append(p.Bins, Bin{Inner: edges[i-1], Outer: edges[i], Minus: sigma, Plus: sigma, Beta: b, Beta2: b * b, Nodes: areaNodes(edges[i-1], edges[i], 4)})
	}
	s := signal{critical: c.SigmaCritical(0.25, math.Inf(1)), bins: p.Bins, elongation: 1, distance: 1, response: 1}
	g := make([]float64, len(p.Bins))
	s.predict(m, g)
	for i := range g {
		p.Bins[i].Shear = g[i]
	}
	return p
}

func logEdges(spans ...[3]float64) []float64 {
	edges := []float64{spans[0][0]}
	for _, s := range spans {
		n := int(s[2])
		for i := 1; i <= n; i++ {
			edges = append(edges, s[0]*math.Pow(s[1]/s[0], float64(i)/s[2]))
		}
	}
	return edges
}

func apertureFit(t testing.TB, p *Profile, settings method.Settings) (*lensFit, *estimate.Task) {
	data, err := p.MarshalBinary()
	if err != nil {
		t.Fatal(err)
	}
	task := &estimate.Task{
		Name: "lensing.shear.aperture", Object: estimate.Object{Redshift: 0.25}, Cosmology: background(t), Settings: settings,
		Reduced: map[string][]byte{"profile": data}, Sampling: infer.Options{Stream: infer.NewStream("aperture")},
	}
	f, err := newLensFit(task)
	if err != nil {
		t.Fatal(err)
	}
	return f, task
}

func span(lo, hi float64) method.Value {
	return method.Value{Set: true, Unit: "kpc", Numbers: []float64{lo, hi}}
}

// TestZeta holds ζ_c, the bound and the mass of the cylinder to the reference.
// The data are reduced shears in fine bins, so the step from g to γ is tested
// with it.
func TestZeta(t *testing.T) {
	data, err := os.ReadFile("../../testdata/lensing/aperture.json")
	if err != nil {
		t.Fatal(err)
	}
	var ref struct {
		Rows []struct{ R1, R2, R3, Zeta, Bound, Mass float64 }
	}
	if err := json.Unmarshal(data, &ref); err != nil || len(ref.Rows) == 0 {
		t.Fatalf("%v, %d rows", err, len(ref.Rows))
	}
	h := readReference(t).Halo
	nfw := halo.NewNFW(h.M200c, h.C200c, 200*background(t).CriticalDensity(h.Redshift))
	for _, row := range ref.Rows {
		s := defaults(aperture)
		s["radius"], s["control"] = method.Exactly(row.R1), span(row.R2, row.R3)
		p := finely(t, nfw, logEdges([3]float64{row.R1, row.R2, 200}, [3]float64{row.R2, row.R3, 100}), 0.01)
		f, _ := apertureFit(t, p, s)
		if err := f.addAperture(); err != nil {
			t.Fatal(err)
		}
		a := f.parts[0].(*aperturePart)
		control := a.controlConvergence(lensOf(nfw))
		zeta := a.zeta(control, lens{Model: nfw, theta: make([]float64, len(f.parameters.Free)), elongation: 1, distance: 1})
		// The control annulus has its mean κ throughout, off by 0.005 at its edges
		// where g is 0.03; bins of 0.5% err by 1e-5.
		near(t, "ζ_c", zeta, row.Zeta, 1e-3)
		area := math.Pi * row.R1 * row.R1 * a.criticalOfMean()
		near(t, "bound", area*zeta, row.Bound, 1e-3)
		near(t, "mass of the cylinder", area*(zeta+control), row.Mass, 1e-3)
	}
}

// TestAperture weighs a cylinder in ten bins.
func TestAperture(t *testing.T) {
	nfw := halo.NewNFW(1e15, 4, 200*background(t).CriticalDensity(0.25))
	s := defaults(aperture)
	s["radius"], s["control"] = method.Exactly(500), span(1500, 3000)
	s["concentration"] = method.Distributed(prior.LogNormal(4, 0.3))
	_, task := apertureFit(t, finely(t, nfw, logEdges([3]float64{200, 3200, 12}), 0.003), s)
	d, err := aperture.Run(context.Background(), task)
	if err != nil {
		t.Fatal(err)
	}
	edge := d.Covers[0]
	m := infer.Percentiles(parameter(t, d, "projected_mass"), 16, 50, 84)
	if want := nfw.ProjectedMass(edge); !(m[0] < want && want < m[2]) || math.Log(m[2]/m[0]) > 0.2 {
		t.Errorf("%.4g inside %.4g kpc, want %.4g", m, edge, want)
	}
	if edge < 500 || edge > 640 || d.Covers[1] != edge || d.Quality.Dof != 0 || !d.Quality.Converged {
		t.Errorf("covers %v, %+v", d.Covers, d.Quality)
	}
	a := strings.Join(d.Assumes, "\n")
	for _, w := range []string{"ζ_c = ", "lower bound", "control annulus: 16", "mean convergence of 0.0"} {
		if !strings.Contains(a, w) {
			t.Errorf("assumes %q, without %q", a, w)
		}
	}

	for _, x := range []struct {
		name  string
		spoil func(method.Settings)
		says  string
	}{
		{"control inside", func(s method.Settings) { s["control"] = span(300, 3000) }, "beyond the cylinder"},
		{"inside out", func(s method.Settings) { s["control"] = span(3000, 1500) }, "control annulus"},
		{"too few bins", func(s method.Settings) { s["control"] = span(600, 800) }, "bins lie between"},
		{"no noise of shapes", func(s method.Settings) { s["covariance"] = method.Words("halo") }, "covariance"},
	} {
		k := *task
		k.Settings = method.Settings{}
		for name, v := range s {
			k.Settings[name] = v
		}
		x.spoil(k.Settings)
		_, err := aperture.Run(context.Background(), &k)
		refused(t, x.name, err, "lensing.shear.aperture", x.says)
	}
	gap := finely(t, nfw, logEdges([3]float64{200, 3200, 12}), 0.003)
	gap.Bins = append(gap.Bins[:6:6], gap.Bins[7:]...)
	_, task = apertureFit(t, gap, s)
	_, err = aperture.Run(context.Background(), task)
	refused(t, "a gap", err, "no shear between")
}
