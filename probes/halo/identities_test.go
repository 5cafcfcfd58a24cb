package halo

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/integrate/quad"
	"pgregory.net/rapid"

	"steelyard/probes/constants"
)

// genModel draws a model of any kind, cluster-sized.
func genModel(t *rapid.T) Model {
	scale := rapid.Float64Range(20, 800).Draw(t, "scale")
	density := math.Exp(rapid.Float64Range(9, 16).Draw(t, "ln density"))
	sigma := rapid.Float64Range(200, 1800).Draw(t, "sigma")
	return rapid.SampledFrom([]Model{
		NFW{RhoS: density, Rs: scale},
		Isothermal{Sigma: sigma},
		CoredIsothermal{Sigma: sigma, Core: scale},
		Hernquist{Total: density * scale * scale * scale, Scale: scale},
		Einasto{RhoS: density, Rs: scale, Alpha: rapid.Float64Range(0.12, 0.6).Draw(t, "alpha")},
		Beta{Rho0: density, Core: scale, Beta: rapid.Float64Range(0.4, 1.2).Draw(t, "beta")},
	}).Draw(t, "model")
}

// rings integrates f from a to b: 40 points of Gauss and Legendre in ln r.
func rings(f func(r float64) float64, a, b float64) float64 {
	g := func(s float64) float64 { r := math.Exp(s); return r * f(r) }
	return quad.Fixed(g, math.Log(a), math.Log(b), 40, nil, 0)
}

// TestIdentities checks, for every model, what ties its functions together. The
// integrals reach rounding over a factor of three in radius; what is left is the
// rounding of the difference of two large numbers, for which 1e-13 of them is
// allowed.
func TestIdentities(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m := genModel(t)
		a := rapid.Float64Range(5, 3000).Draw(t, "r")
		b := 3 * a
		same := func(what string, got, want, tolerance float64) {
			if !(math.Abs(got-want) <= tolerance*math.Abs(want)) {
				t.Fatalf("%T: %s at %g: %.15g, want %.15g", m, what, a, got, want)
			}
		}
		grows := func(what string, from, to, by float64) {
			if !(math.Abs(to-from-by) <= 1e-13*(math.Abs(from)+math.Abs(to))) {
				t.Fatalf("%T: %s at %g: from %.15g to %.15g, by %.15g", m, what, a, from, to, by)
			}
		}
		shell := rings(func(r float64) float64 { return 4 * math.Pi * r * r * m.Density(r) }, a, b)
		grows("dM = 4πr²ρ dr", m.Mass(a), m.Mass(b), shell)
		ring := rings(func(r float64) float64 { return 2 * math.Pi * r * m.SurfaceDensity(r) }, a, b)
		grows("dM₂ = 2πRΣ dR", m.ProjectedMass(a), m.ProjectedMass(b), ring)
		work := rings(func(r float64) float64 { return constants.G * m.Mass(r) / (r * r) }, a, b)
		grows("dφ = GM/r² dr", m.Potential(a), m.Potential(b), work)

		surface, mean := Projected(m, a)
		same("Σ", surface, m.SurfaceDensity(a), 0)
		same("mean Σ", mean, m.MeanSurfaceDensity(a), 0)
		grows("mean = Σ + ΔΣ", surface, mean, m.ExcessSurfaceDensity(a))
		same("πR² mean", m.ProjectedMass(a), math.Pi*a*a*mean, 1e-14)
		if m.ProjectedMass(a) < m.Mass(a)*(1-1e-13) { // nothing but rounding lies outside a steep halo
			t.Fatalf("%T: the cylinder of %g kpc holds less than the sphere", m, a)
		}
		if v := m.EscapeSpeed(a); !math.IsInf(v, 1) {
			same("escape speed", v*v, -2*m.Potential(a), 1e-14)
		}
	})
}

// TestProjection projects the density of every model by a quadrature of its own:
// with r = R cosh t the integrand is even and analytic, so the trapezoid rule
// converges geometrically (Trefethen & Weideman 2014). The slowest density, r^−1.2
// of the beta model, is cut at t = 150 where exp(−0.2 t) leaves 1e-13.
func TestProjection(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m := genModel(t)
		R := rapid.Float64Range(5, 3000).Draw(t, "R")
		const h = 1.0 / 16
		sum := m.Density(R) / 2
		for i := 1; i < 150/h; i++ {
			cosh := math.Cosh(float64(i) * h)
			sum += m.Density(R*cosh) * cosh
		}
		got, want := m.SurfaceDensity(R), 2*R*h*sum
		if !(math.Abs(got/want-1) < 1e-11) {
			t.Fatalf("%T: Σ(%g) = %.15g, the density projects to %.15g", m, R, got, want)
		}
	})
}

// TestRoundTrip finds the radius of a mean density and the mean density there.
func TestRoundTrip(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m := genModel(t)
		r := math.Exp(rapid.Float64Range(0, 9).Draw(t, "ln r"))
		threshold := 3 * m.Mass(r) / (4 * math.Pi * r * r * r)
		got, err := RadiusAt(m, threshold)
		if err != nil {
			t.Fatal(err)
		}
		// In a core the mean density hardly depends on the radius, so the
		// density is what has to come back.
		back := 3 * m.Mass(got) / (4 * math.Pi * got * got * got)
		if !(math.Abs(back/threshold-1) < 1e-12) {
			t.Fatalf("%T: mean density %g at %g kpc, asked for %g (%g kpc)", m, back, got, threshold, r)
		}
	})
}

// TestConstructors gives back the mass and the concentration asked for.
func TestConstructors(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		mass := math.Exp(rapid.Float64Range(math.Log(1e12), math.Log(1e16)).Draw(t, "ln M"))
		c := rapid.Float64Range(1, 40).Draw(t, "c")
		const threshold = 3e4
		radius := sphereRadius(mass, threshold)
		for _, m := range []Model{
			NewNFW(mass, c, threshold),
			NewIsothermal(mass, threshold),
			NewHernquist(mass, c, threshold),
			NewEinasto(mass, c, 0.2, threshold),
			NewCoredIsothermal(mass, radius/c, threshold),
		} {
			got, err := RadiusAt(m, threshold)
			if err != nil {
				t.Fatal(err)
			}
			if math.Abs(got/radius-1) > 1e-12 || math.Abs(m.Mass(radius)/mass-1) > 1e-12 {
				t.Fatalf("%T: M(<%g) = %g, want %g inside %g", m, got, m.Mass(radius), mass, radius)
			}
			if _, bare := m.(Isothermal); bare {
				continue
			}
			if _, cored := m.(CoredIsothermal); cored {
				continue
			}
			r := radius / c
			const h = 1e-4
			slope := math.Log(m.Density(r*math.Exp(h))/m.Density(r*math.Exp(-h))) / (2 * h)
			if math.Abs(slope+2) > 1e-7 { // the error of the difference is h² times order one
				t.Fatalf("%T: slope %g at the scale radius", m, slope)
			}
		}
	})
}

// TestSmooth walks the NFW projections through the scale radius and through the
// seams of their formulae: second differences stay at rounding.
func TestSmooth(t *testing.T) {
	h := NFW{RhoS: 1, Rs: 1}
	k := Hernquist{Total: 1, Scale: 1}
	for _, centre := range []float64{0.1, 0.3, 0.9, 0.97, 1, 1.03, 1.1} {
		for name, f := range map[string]func(float64) float64{
			"NFW mass": h.Mass, "NFW Σ": h.SurfaceDensity, "NFW mean Σ": h.MeanSurfaceDensity, "NFW ΔΣ": h.ExcessSurfaceDensity,
			"Hernquist Σ": k.SurfaceDensity, "Hernquist ΔΣ": k.ExcessSurfaceDensity,
		} {
			const d = 1e-6
			for i := -20; i <= 20; i++ {
				x := centre + float64(i)*d/3
				bend := (f(x+d) - 2*f(x) + f(x-d)) / f(x)
				if math.Abs(bend) > 5*d*d/(x*x) { // power laws of −3 to 2 bend by less than 12 d²/x², these by less than half of it
					t.Errorf("%s bends by %.1g at %g", name, bend, x)
				}
			}
		}
	}
}

// TestLimits checks the models against each other where they meet.
func TestLimits(t *testing.T) {
	// The isothermal sphere with a core is the beta model of β = 2/3.
	cored := CoredIsothermal{Sigma: 900, Core: 80}
	beta := Beta{Rho0: cored.Density(0), Core: 80, Beta: 2.0 / 3}
	// Far outside a core there is no core; far inside NFW and Hernquist are both
	// r⁻¹ cusps.
	bare := Isothermal{Sigma: 900}
	cusp, other := NFW{RhoS: 1, Rs: 1}, Hernquist{Total: 2 * math.Pi, Scale: 1}
	for _, r := range []float64{1, 30, 300, 3000} {
		near(t, "M of β = 2/3", beta.Mass(r), cored.Mass(r), 1e-13)
		near(t, "Σ of β = 2/3", beta.SurfaceDensity(r), cored.SurfaceDensity(r), 1e-13)
		near(t, "ΔΣ of β = 2/3", beta.ExcessSurfaceDensity(r), cored.ExcessSurfaceDensity(r), 1e-11)
		near(t, "φ of β = 2/3", beta.Potential(r), cored.Potential(r), 1e-12)
		far := 1e6 * r
		near(t, "M without a core", cored.Mass(far), bare.Mass(far), 2*80/far)
		near(t, "Σ without a core", cored.SurfaceDensity(far), bare.SurfaceDensity(far), 2*80/far)
		deep := 1e-8 * r
		near(t, "cusps", other.Mass(deep), cusp.Mass(deep), 2*deep)
	}
	// Three masses typed in from the singular isothermal sphere: 2σ²r/G for
	// σ = 1000 km/s and 1 Mpc is 4.65e14 Msun.
	near(t, "isothermal mass", Isothermal{Sigma: 1000}.Mass(1000), 4.650e14, 1e-4)
	if v := bare.EscapeSpeed(100); !math.IsInf(v, 1) || bare.Potential(1) != 0 {
		t.Errorf("isothermal: escape speed %g, φ(1 kpc) = %g", v, bare.Potential(1))
	}
}
