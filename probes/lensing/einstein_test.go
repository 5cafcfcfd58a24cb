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

// TestEinsteinRadius holds the radii to testdata/lensing/einstein.json, which
// names its source, at its tolerance.
func TestEinsteinRadius(t *testing.T) {
	data, err := os.ReadFile("../../testdata/lensing/einstein.json")
	if err != nil {
		t.Fatal(err)
	}
	type row struct {
		Z, M200c, C200c, Zl, Zs, Sigma, Mass float64
		Radius                               float64 `json:"radius_kpc"`
		Theta                                float64 `json:"theta_arcsec"`
	}
	var ref struct{ NFW, Isothermal, Point []row }
	if err := json.Unmarshal(data, &ref); err != nil {
		t.Fatal(err)
	}
	c := background(t)
	check := func(m halo.Model, lens float64, r row) {
		ring := ringPart{critical: c.SigmaCritical(lens, r.Zs)}
		radius := ring.einsteinRadius(lensOf(m))
		near(t, "Einstein radius", radius, r.Radius, 1e-10)
		near(t, "in arcsec", radius/c.AngularDiameter(lens)*180/math.Pi*3600, r.Theta, 1e-10)
		near(t, "mass inside", math.Pi*radius*radius*ring.critical, r.Mass, 1e-9) // twice the radius's error and more
	}
	for _, r := range ref.NFW {
		check(halo.NewNFW(r.M200c, r.C200c, 200*c.CriticalDensity(r.Z)), r.Z, r)
	}
	for _, r := range ref.Isothermal {
		check(halo.Isothermal{Sigma: r.Sigma}, r.Zl, r)
	}
	for _, r := range ref.Point {
		check(point(r.Mass), r.Zl, r)
	}
	if len(ref.NFW) == 0 || len(ref.Isothermal) == 0 || len(ref.Point) == 0 {
		t.Error("figures are missing")
	}
}

// point is a point mass, which only a test needs.
type point float64

func (p point) Density(float64) float64              { return 0 }
func (p point) Mass(float64) float64                 { return float64(p) }
func (p point) SurfaceDensity(float64) float64       { return 0 }
func (p point) MeanSurfaceDensity(R float64) float64 { return float64(p) / (math.Pi * R * R) }
func (p point) ExcessSurfaceDensity(R float64) float64 {
	return p.MeanSurfaceDensity(R)
}
func (p point) ProjectedMass(float64) float64 { return float64(p) }
func (p point) Potential(float64) float64     { return 0 }
func (p point) EscapeSpeed(float64) float64   { return 0 }

func lensOf(m halo.Model) lens { return lens{Model: m, elongation: 1, distance: 1} }

// TestNoEinsteinRadius: a lens too thin for a ring, and one that is all ring.
func TestNoEinsteinRadius(t *testing.T) {
	thin := halo.CoredIsothermal{Sigma: 100, Core: 300}
	critical := background(t).SigmaCritical(0.25, 1)
	if r := meanSurfaceRadius(thin, critical); r != 0 {
		t.Errorf("a thin core has an Einstein radius of %g kpc", r)
	}
	if r := meanSurfaceRadius(halo.Isothermal{Sigma: 1e5}, critical); !math.IsInf(r, 1) {
		t.Errorf("an absurd sphere has an Einstein radius of %g kpc", r)
	}
}

// ringTask states the Einstein radius of a halo with an error of 3%.
func ringTask(t testing.TB, m halo.Model, source float64) *estimate.Task {
	c := background(t)
	radius := meanSurfaceRadius(m, c.SigmaCritical(0.25, source))
	s := defaults(einsteinRadiusMethod)
	s["radius"] = method.Distributed(prior.Normal(radius, 0.03*radius))
	s["source_redshift"] = method.Exactly(source)
	return &estimate.Task{
		Name: "lensing.arc.ring", Object: estimate.Object{Redshift: 0.25}, Cosmology: c, Settings: s,
		Sampling: infer.Options{Stream: infer.NewStream("ring")},
	}
}

// TestRing weighs the sphere inside which an isothermal sphere's ring lies: the
// dispersion follows from the radius in closed form, θ_E = 4π (σ/c)² D_ls/D_s.
func TestRing(t *testing.T) {
	task := ringTask(t, halo.Isothermal{Sigma: 1000}, 2)
	task.Settings["halo"] = method.Word("isothermal")
	d, err := einsteinRadiusMethod.Run(context.Background(), task)
	if err != nil {
		t.Fatal(err)
	}
	s := infer.Percentiles(parameter(t, d, "dispersion"), 16, 50, 84)
	// σ ∝ θ_E^½, so 3% of one is 1.5% of the other; 4000 draws know a percentile
	// to a thirtieth of that. The flat prior in ln M moves the median by less.
	near(t, "dispersion", s[1], 1000, 2e-3)
	near(t, "its error", (s[2]-s[0])/2, 15, 0.06)
	m := infer.Percentiles(parameter(t, d, "projected_mass"), 50)[0]
	near(t, "projected mass", m, halo.Isothermal{Sigma: s[1]}.ProjectedMass(ringRadius(t, halo.Isothermal{Sigma: s[1]})), 2e-3)
	if d.Covers[0] != d.Covers[1] || math.Abs(d.Covers[0]/ringRadius(t, halo.Isothermal{Sigma: 1000})-1) > 1e-9 {
		t.Errorf("covers %v", d.Covers)
	}
	if !d.Quality.Converged || d.Quality.Dof != 0 {
		t.Errorf("%+v", d.Quality)
	}
}

func ringRadius(t testing.TB, m halo.Model) float64 {
	return meanSurfaceRadius(m, background(t).SigmaCritical(0.25, 2))
}

// TestRingOfNFW: the projected mass is known to 6%, the spherical mass no
// better than the concentration allows, and an elongation moves the sphere's
// mass and not the cylinder's.
func TestRingOfNFW(t *testing.T) {
	nfw := halo.NewNFW(1.5e15, 6, 200*background(t).CriticalDensity(0.25))
	task := ringTask(t, nfw, 2)
	task.Settings["concentration"] = method.Distributed(prior.LogNormal(6, 0.2))
	widths := func() (cylinder, sphere, mass float64) {
		d, err := einsteinRadiusMethod.Run(context.Background(), task)
		if err != nil {
			t.Fatal(err)
		}
		if !d.Quality.Converged {
			t.Errorf("%+v", d.Quality)
		}
		p := infer.Percentiles(parameter(t, d, "projected_mass"), 16, 50, 84)
		m := infer.Percentiles(parameter(t, d, "mass_200c"), 16, 50, 84)
		near(t, "projected mass", p[1], nfw.ProjectedMass(ringRadius(t, nfw)), 0.02)
		return math.Log(p[2]/p[0]) / 2, math.Log(m[2]/m[0]) / 2, m[1]
	}
	cylinder, sphere, _ := widths()
	near(t, "error of the cylinder", cylinder, 0.06, 0.1)
	if sphere < 0.15 {
		t.Errorf("the sphere is known to %.3f in ln", sphere)
	}
	task.Settings["concentration"] = method.Exactly(6)
	_, _, plain := widths()
	task.Settings["elongation"] = method.Exactly(1.3)
	_, _, drawn := widths()
	if !(drawn < plain/1.3) { // a smaller halo is concentrated on a smaller scale
		t.Errorf("a halo drawn out by 1.3 has %.3g instead of %.3g Msun", drawn, plain)
	}
}

func TestRefusedRings(t *testing.T) {
	for _, x := range []struct {
		name  string
		spoil func(method.Settings)
		says  string
	}{
		{"no error", func(s method.Settings) { s["radius"] = method.Exactly(60) }, "needs an error"},
		{"below zero", func(s method.Settings) { s["radius"] = method.Distributed(prior.Normal(-60, 1)) }, "above zero"},
		{"in front", func(s method.Settings) { s["source_redshift"] = method.Exactly(0.2) }, "in front of the lens"},
	} {
		task := ringTask(t, halo.Isothermal{Sigma: 1000}, 2)
		x.spoil(task.Settings)
		_, err := einsteinRadiusMethod.Run(context.Background(), task)
		refused(t, x.name, err, "lensing.arc.ring", x.says)
	}
}

// TestCombined fits shear and ring of one halo: the concentration is known far
// better than by the shear alone.
func TestCombined(t *testing.T) {
	nfw := halo.NewNFW(1e15, 6, 200*background(t).CriticalDensity(0.25))
	task := profileOf(t, nfw, 0.01)
	data, err := reduced(t, task).MarshalBinary()
	if err != nil {
		t.Fatal(err)
	}
	ring := ringTask(t, nfw, 2)
	task.Settings = defaults(combined)
	task.Settings["concentration"] = method.Distributed(prior.LogUniform(1, 30))
	task.Settings["fit_within"] = method.Value{Set: true, Unit: "kpc", Numbers: []float64{400, 3000}} // the core is the ring's
	task.Settings["radius"], task.Settings["source_redshift"] = ring.Settings["radius"], ring.Settings["source_redshift"]
	task.Reduced = map[string][]byte{"profile": data}
	task.Sampling.Stream = infer.NewStream("both")
	width := func(m estimate.Method) float64 {
		d, err := m.Run(context.Background(), task)
		if err != nil {
			t.Fatal(err)
		}
		c := infer.Percentiles(parameter(t, d, "concentration"), 2.5, 50, 97.5)
		if !(c[0] < 6 && 6 < c[2]) {
			t.Errorf("%s: concentration %.4g", m.Name, c)
		}
		if m.Name == "combined" {
			if d.Quality.Dof != 2 || d.Covers[0] >= 100 || d.Covers[1] != 3000 {
				t.Errorf("covers %v, %d degrees of freedom", d.Covers, d.Quality.Dof)
			}
			if a := strings.Join(d.Assumes, "\n"); !strings.Contains(a, "Einstein radius") || !strings.Contains(a, "shape noise") {
				t.Errorf("assumes %q", a)
			}
		}
		return math.Log(c[2] / c[0])
	}
	if shear, both := width(tangentialShear), width(combined); both > shear/2 {
		t.Errorf("ln c is known to %.3f with the ring, %.3f without", both, shear)
	}
}
