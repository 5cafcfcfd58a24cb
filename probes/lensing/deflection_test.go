package lensing

import (
	"math"
	"testing"

	"steelyard/probes/constants"
	"steelyard/probes/halo"
	"steelyard/probes/infer"
)

// bent is a deflector of an elliptical NFW halo, a galaxy and a shear.
func bent(t testing.TB) *deflector {
	c := background(t)
	const z = 0.25
	critical := c.SigmaCritical(z, math.Inf(1))
	return &deflector{
		distance: c.AngularDiameter(z), main: halo.NewNFW(1.2e15, 7, 200*c.CriticalDensity(z)), critical: critical, scale: 1 / critical,
		place:    shape{2 * arcsec, -1 * arcsec, 0.1, -0.07},
		galaxies: []truncated{newTruncated(250, 0.5, 40)}, places: []shape{{-20 * arcsec, 15 * arcsec, -0.05, 0.1}},
		shear: [2]float64{0.03, -0.02}, efficiency: 1,
	}
}

// The Hessian is the slope of the deflection, and symmetric because the
// deflection is the slope of a potential. Differences over 0.01 arcsec are good
// to 1e-7 here.
func TestHessianIsTheSlopeOfTheDeflection(t *testing.T) {
	d := bent(t)
	const h = 0.01 * arcsec
	for _, p := range [][2]float64{{30, 10}, {-18, 17}, {-5, -40}, {1, 2}} {
		x, y := p[0]*arcsec, p[1]*arcsec
		b := d.at(x, y, 0.8)
		east, west, north, south := d.at(x+h, y, 0.8), d.at(x-h, y, 0.8), d.at(x, y+h, 0.8), d.at(x, y-h, 0.8)
		for _, c := range []struct {
			what      string
			got, want float64
		}{
			{"xx", b.xx, (east.x - west.x) / (2 * h)}, {"yy", b.yy, (north.y - south.y) / (2 * h)},
			{"xy", b.xy, (north.x - south.x) / (2 * h)}, {"yx", b.xy, (east.y - west.y) / (2 * h)},
		} {
			if math.Abs(c.got-c.want) > 1e-5 {
				t.Errorf("%s at %v: %.9g, by differences %.9g", c.what, p, c.got, c.want)
			}
		}
	}
}

// A singular isothermal sphere deflects by θ_E = 4π (σ/c)² β everywhere, and
// makes of a source at u < θ_E images at θ_E + u and u − θ_E (Schneider, Ehlers
// & Falco 1992, §8.1; from memory).
func TestIsothermalImages(t *testing.T) {
	d := bent(t)
	const sigma, beta = 900.0, 0.8
	d.main, d.galaxies, d.places, d.shear, d.place = halo.Isothermal{Sigma: sigma}, nil, nil, [2]float64{}, shape{}
	// The critical density at infinity holds the distances, so that θ_E is exact
	// for the lens's own efficiency.
	ring := sigma * sigma / (constants.G * d.distance * d.critical) * beta
	if b := d.at(3*arcsec, 4*arcsec, beta); math.Abs(math.Hypot(b.x, b.y)/ring-1) > 1e-6 { // the softened centre
		t.Errorf("deflection %.8g, not %.8g arcsec", math.Hypot(b.x, b.y)/arcsec, ring/arcsec)
	}
	u := 5 * arcsec
	f := &Family{Images: []Image{{(ring + u) * 0.6, (ring + u) * 0.8, arcsec}, {(u - ring) * 0.6, (u - ring) * 0.8, arcsec}}}
	res := make([]float64, 4)
	_, made := d.imagePlane(f, beta, 0, res)
	if !made {
		t.Error("the images are not made")
	}
	for _, r := range res {
		if math.Abs(r) > 1e-5 {
			t.Errorf("residuals %v of exact images", res)
		}
	}
	// Both moved outwards by 0.3: no source does that, for their sum of distances
	// is 2 θ_E, so each misses by 0.3.
	for i := range f.Images {
		r := math.Hypot(f.Images[i].X, f.Images[i].Y)
		f.Images[i].X *= 1 + 0.3*arcsec/r
		f.Images[i].Y *= 1 + 0.3*arcsec/r
	}
	d.imagePlane(f, beta, 0, res)
	for i := range 2 {
		if miss := math.Hypot(res[2*i], res[2*i+1]); math.Abs(miss-0.3) > 1e-3 {
			t.Errorf("image %d misses by %.6g arcsec, not 0.3", i, miss)
		}
	}
	// A source outside the ring has one image: its second cannot be made.
	f.Images = []Image{{ring * 2.5, 0, arcsec}, {-0.3 * ring, 2 * ring, arcsec}}
	if _, made := d.imagePlane(f, beta, 0, res); made && math.Hypot(res[2], res[3]) < 10 {
		t.Errorf("an image is made where there is none: %v", res)
	}
}

// The convergence of the elliptical potential is κ + ε cos 2φ_ε γ at ρ (Golse &
// Kneib 2002, A&A 390, 821; from memory), the cosine being one along the major
// axis; and the mass inside a circle is that of
// the round halo to second order in ε.
func TestEllipticalPotential(t *testing.T) {
	d := bent(t)
	d.galaxies, d.places, d.shear = nil, nil, [2]float64{}
	for _, e := range []float64{0.05, 0.1, 0.2} {
		d.place = shape{0, 0, e, 0}
		const r = 40 * arcsec
		for _, axis := range []struct{ x, y, sign float64 }{{r, 0, -1}, {0, r, 1}} {
			b := d.at(axis.x, axis.y, 1)
			surface, mean := halo.Projected(d.main, r*math.Sqrt(1+axis.sign*e)*d.distance)
			kappa, gamma := surface*d.scale, (mean-surface)*d.scale
			near(t, "κ on an axis", (b.xx+b.yy)/2, kappa-axis.sign*e*gamma, 1e-8) // the softened centre
		}
		// Gauss: the mean deflection across a circle is R κ̄.
		const n = 720
		sum := 0.0
		for i := range n {
			s, c := math.Sincos(2 * math.Pi * float64(i) / n)
			b := d.at(r*c, r*s, 1)
			sum += (b.x*c + b.y*s) / n
		}
		_, mean := halo.Projected(d.main, r*d.distance)
		off := sum/(r*mean*d.scale) - 1
		if math.Abs(off) > e*e {
			t.Errorf("ε = %g: the mass inside a circle is off by %.2g", e, off)
		}
	}
}

// A component pointing north, at position angle zero, is denser northward; and
// the mass of all of it is π σ² (r_t − r_c)/G (Kneib et al. 1996; from memory).
func TestLensComponents(t *testing.T) {
	one := arcs
	one.Redshifts = one.Redshifts[:1]
	task := imagesTask(t, dense, dense.Arcs(one, infer.NewStream("arcs").Rand(0)), arcs.Error)
	task.Tables["components"] = table("members.csv", column("ra", "rad", dense.RA), column("dec", "rad", dense.Dec),
		column("ellipticity", "", 0.1), column("position_angle", "rad", 0))
	m, err := readImages(task)
	if err != nil {
		t.Fatal(err)
	}
	d := bent(t)
	c := m.Components[0]
	g := newTruncated(300, 1, 50)
	convergence := func(x, y float64) float64 {
		var b bending
		shape{c.X, c.Y, c.E1, c.E2}.add(&b, g.Projected, x, y, d.scale, d.distance)
		return b.xx + b.yy
	}
	if north, east := convergence(0, 5*arcsec), convergence(5*arcsec, 0); !(north > 1.1*east) {
		t.Errorf("κ is %.4g northward and %.4g eastward", north, east)
	}
	whole := math.Pi * 300 * 300 * 49 / constants.G
	near(t, "mass", g.Mass(1e7), whole, 1e-5) // the tail beyond is r_t/r
	const R = 1e6
	_, mean := g.Projected(R)
	near(t, "projected mass", mean*math.Pi*R*R, whole, 1e-4)
}
