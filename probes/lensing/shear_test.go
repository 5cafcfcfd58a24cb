package lensing

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/integrate/quad"

	"steelyard/probes/halo"
)

// TestMeanOverSources holds the efficiencies and the shear of several source
// distributions to the reference, at its tolerance.
func TestMeanOverSources(t *testing.T) {
	const tolerance = 1e-10
	ref, c := readReference(t), background(t)
	e := newEfficiencies(c, ref.Halo.Redshift, 0)
	threshold := 200 * c.CriticalDensity(ref.Halo.Redshift)
	nfw := halo.NewNFW(ref.Halo.M200c, ref.Halo.C200c, threshold)
	near(t, "β at infinity", e.limit, ref.BetaInfinity, tolerance)

	// n(z) ∝ z² exp(−(z/0.7)^1.5), by quadrature split at the lens.
	integrate := func(from float64) (beta, beta2 float64) {
		var z, w []float64
		for _, span := range [][2]float64{{from, ref.Halo.Redshift}, {max(from, ref.Halo.Redshift), 1}, {1, 3}, {3, 8}} {
			if span[1] <= span[0] {
				continue
			}
			x, wx := make([]float64, 60), make([]float64, 60)
			quad.Legendre{}.FixedLocations(x, wx, span[0], span[1])
			for i := range x {
				z = append(z, x[i])
				w = append(w, wx[i]*x[i]*x[i]*math.Exp(-math.Pow(x[i]/0.7, 1.5)))
			}
		}
		return e.mean(z, w)
	}
	smooth, smooth2 := integrate(0)
	behind, behind2 := integrate(0.35)
	discrete, discrete2 := e.mean(ref.Discrete.Z, ref.Discrete.Weight)
	for _, d := range []struct {
		name         string
		beta, beta2  float64
		mean, square float64
		rows         []struct {
			R      float64
			Kappa  float64 `json:"kappa_beta1"`
			Gamma  float64 `json:"gamma_beta1"`
			Exact  float64 `json:"g_exact_average"`
			Second float64 `json:"g_SeitzSchneider97"`
		}
	}{
		{"nine redshifts", discrete, discrete2, ref.Discrete.MeanBeta, ref.Discrete.MeanBeta2, ref.Discrete.Rows},
		{"smooth", smooth, smooth2, ref.Smooth.MeanBeta, ref.Smooth.MeanBeta2, ref.Smooth.Rows},
		{"behind 0.35", behind, behind2, ref.Background.MeanBeta, ref.Background.MeanBeta2, ref.Background.Rows},
	} {
		near(t, d.name+": ⟨β⟩", d.beta*e.limit, d.mean, tolerance)
		near(t, d.name+": ⟨β²⟩", d.beta2*e.limit*e.limit, d.square, tolerance)
		for _, row := range d.rows {
			s := signal{
				critical:   c.SigmaCritical(ref.Halo.Redshift, math.Inf(1)),
				bins:       []Bin{{Beta: d.beta, Beta2: d.beta2, Nodes: []Node{{row.R, 1}}}},
				elongation: 1, distance: 1, response: 1,
			}
			var g [1]float64
			s.predict(nfw, g[:])
			near(t, d.name+": g", g[0], row.Second, tolerance)
			// To second order the mean is good to (⟨β³⟩/⟨β⟩) κ² or so of itself.
			near(t, d.name+": g against the exact mean", g[0], row.Exact, row.Kappa*row.Kappa)
		}
	}
}

// TestSinglePlane holds κ, γ and g for sources at one redshift to the
// reference: there ⟨β²⟩ = ⟨β⟩² and the mean is exact.
func TestSinglePlane(t *testing.T) {
	ref, c := readReference(t), background(t)
	nfw := halo.NewNFW(ref.Halo.M200c, ref.Halo.C200c, 200*c.CriticalDensity(ref.Halo.Redshift))
	critical := c.SigmaCritical(ref.Halo.Redshift, math.Inf(1))
	for _, row := range ref.SinglePlane {
		b := newEfficiencies(c, ref.Halo.Redshift, 0).exact(row.Zs)
		surface, mean := halo.Projected(nfw, row.R)
		near(t, "κ", b*surface/critical, row.Kappa, 1e-10)
		near(t, "γ", b*(mean-surface)/critical, row.Gamma, 1e-10)
		near(t, "g", reducedShear((mean-surface)/critical, surface/critical, b, b*b), row.G, 1e-10)
	}
}

// TestSignal says what each assumption multiplies, on an isothermal sphere,
// for which γ = κ = θ_E/2θ in closed form.
func TestSignal(t *testing.T) {
	c := background(t)
	critical := c.SigmaCritical(0.25, math.Inf(1))
	sphere := halo.Isothermal{Sigma: 900}
	const R, beta, beta2 = 300.0, 0.6, 0.4
	kappa := sphere.SurfaceDensity(R) / critical
	for _, x := range []struct {
		name                           string
		elongation, distance, response float64
	}{
		{"as it is", 1, 1, 1},
		{"drawn out", 1.3, 1, 1},
		{"farther sources", 1, 1.1, 1},
		{"calibrated and diluted", 1, 1, 1.02 * 0.9},
	} {
		s := signal{critical: critical, bins: []Bin{{Beta: beta, Beta2: beta2, Nodes: []Node{{R, 1}}}}, elongation: x.elongation, distance: x.distance, response: x.response}
		var g [1]float64
		s.predict(sphere, g[:])
		k := kappa * x.elongation
		want := x.response * x.distance * beta * k / (1 - x.distance*beta2/beta*k)
		near(t, x.name, g[0], want, 1e-14) // rounding
	}
}

// TestInsideCriticalCurve checks that the expected ellipticity stays below one
// and continuous where the shear does not.
func TestInsideCriticalCurve(t *testing.T) {
	c := background(t)
	sphere := halo.Isothermal{Sigma: 1500}
	s := signal{critical: c.SigmaCritical(0.25, math.Inf(1)), bins: []Bin{{Beta: 0.7, Beta2: 0.49, Nodes: []Node{{0, 1}}}}, elongation: 1, distance: 1, response: 1}
	last := 0.0
	for R := 1.0; R < 1000; R *= 1.002 {
		s.bins[0].Nodes[0].Radius = R
		var g [1]float64
		s.predict(sphere, g[:])
		if !(math.Abs(g[0]) <= 1) || R > 1 && math.Abs(g[0]-last) > 0.01 {
			t.Fatalf("at %.4g kpc the ellipticity goes from %.4g to %.4g", R, last, g[0])
		}
		last = g[0]
		// κ = γ = x/2, x = θ_E/θ: g = x/(2−x), 1/g beyond x = 1.
		x := 2 * 0.7 * sphere.SurfaceDensity(R) / s.critical
		want := x / (2 - x)
		if x > 1 {
			want = (2 - x) / x
		}
		if math.Abs(g[0]-want) > 1e-12 {
			t.Fatalf("ellipticity %.15g at %.4g kpc, want %.15g", g[0], R, want)
		}
	}
	if reducedShear(0.1, 0.1, 0, 0) != 0 {
		t.Error("sources in the foreground are sheared")
	}
}

func TestEfficiencyTable(t *testing.T) {
	c := background(t)
	for _, lens := range []float64{0.01, 0.25, 1.2} {
		for _, far := range []float64{1.3, 6, 20} {
			e := newEfficiencies(c, lens, far)
			for i := range 997 {
				z := far * float64(i) / 996
				// As the comment of at promises.
				if d := e.at(z) - e.exact(z); math.Abs(d) > 1e-9 {
					t.Fatalf("lens at %g: β(%g) is off by %.1g with a table to %g", lens, z, d, far)
				}
			}
		}
	}
}
