package mock

import (
	"math"
	"math/rand/v2"
	"testing"

	"steelyard/probes/constants"
)

// An isotropic NFW halo's radial dispersion by the Jeans equation, computed with
// mpmath at 30 digits (Łokas & Mamon 2001): M_200c = 8e14 Msun, c = 4.5,
// z = 0.25, H0 = 70, Ω_m = 0.3.
var (
	equilibrium = Truth{Redshift: 0.25, HubbleConstant: 70, OmegaMatter: 0.3, M200: 8e14, C200: 4.5, RA: 1, Dec: 0.3}
	jeansRadial = []struct{ r, sigma float64 }{
		{19.56602190514864, 645.3421523148077},
		{117.3961314308919, 917.5899045477194},
		{391.3204381029728, 962.6506150569313},
		{1760.941971463378, 801.562331089185},
		{3521.883942926756, 682.1751690139719},
	}
)

// The distribution function is the second road to the Jeans equation: the
// variance of the speeds drawn from it is three times σ_r².
func TestSpeedsAreInEquilibrium(t *testing.T) {
	o := equilibrium.Halo().orbits()
	rng := rand.New(rand.NewPCG(1, 2))
	const n = 20000
	for _, want := range jeansRadial {
		sum, fourth := 0.0, 0.0
		for range n {
			v := o.speed(want.r, rng)
			sum += v * v
			fourth += v * v * v * v
		}
		mean := sum / n / 3
		// Four standard errors of the mean square, plus 0.2% for the grids.
		margin := 4*math.Sqrt((fourth/n-sum/n*sum/n)/n)/3 + 0.004*mean
		if got := mean; math.Abs(got-want.sigma*want.sigma) > margin {
			t.Errorf("σ_r(%.0f kpc) = %.1f, want %.1f", want.r, math.Sqrt(got), want.sigma)
		}
	}
}

// The same with anisotropic orbits, β = 0.3 and −0.5 (mpmath at 30 digits).
func TestVarianceOfAnisotropicOrbits(t *testing.T) {
	o := equilibrium.Halo().orbits()
	for _, c := range []struct{ beta, r, sigma float64 }{
		{0, 391.3204381029728, 962.6506150569313},
		{0.3, 391.3204381029728, 1111.065686117768}, {0.3, 1760.941971463378, 889.550066103198},
		{-0.5, 391.3204381029728, 802.425517826722}, {-0.5, 1760.941971463378, 698.1571139824941},
	} {
		got := math.Sqrt(lookup(o.lnR, o.radialVariance(c.beta), math.Log(c.r)))
		// The trapezoidal rule in steps of 1.2% in radius.
		if math.Abs(got/c.sigma-1) > 1e-4 {
			t.Errorf("σ_r(%.0f kpc) = %.2f for β = %g, want %.2f", c.r, got, c.beta, c.sigma)
		}
	}
}

// Integrated over all speeds the distribution function gives the density back.
func TestDistributionFunctionGivesTheDensity(t *testing.T) {
	h := equilibrium.Halo()
	o := h.orbits()
	at := func(r float64) float64 {
		psi := lookup(o.lnR, o.psi, math.Log(r))
		const steps = 4000
		top, sum := math.Sqrt(2*psi), 0.0
		for k := range steps {
			v := top * (float64(k) + 0.5) / steps
			sum += v * v * o.density(psi-v*v/2)
		}
		return sum * top / steps
	}
	scale := at(h.Rs) / h.Density(h.Rs)
	for _, x := range []float64{0.03, 0.1, 0.3, 3, 10, 100} {
		// 0.5%: the grid of 1500 radii over eight decades.
		if got, want := at(x*h.Rs)/scale, h.Density(x*h.Rs); math.Abs(got/want-1) > 5e-3 {
			t.Errorf("density at %g r_s is %.4g times what it should be", x, got/want)
		}
	}
}

func TestMotionsCatalogue(t *testing.T) {
	m := Motions{Members: 4000, Infalling: 50, Field: 100, Radius: 20 * math.Pi / 180 / 60, RedshiftError: 1e-4}
	c := equilibrium.Motions(m, rand.New(rand.NewPCG(3, 4)))
	if len(c.RA) != 4150 {
		t.Fatalf("%d galaxies", len(c.RA))
	}
	again := equilibrium.Motions(m, rand.New(rand.NewPCG(3, 4)))
	members, sum := 0, 0.0
	for i := range c.RA {
		if c.RA[i] != again.RA[i] || c.Redshift[i] != again.Redshift[i] {
			t.Fatal("equal streams give different catalogues")
		}
		if c.Member[i] {
			v := constants.SpeedOfLight * (c.Redshift[i] - 0.25) / 1.25
			sum += v * v
			members++
		}
	}
	if members != 4000 {
		t.Errorf("%d members", members)
	}
	// σ_aperture of the same halo inside r_s and r_200 is 931 and 866 km/s (mpmath
	// at 30 digits; Mamon & Łokas 2005); 20 arcmin is 2.66 r_200.
	if sigma := math.Sqrt(sum / 4000); sigma < 780 || sigma > 866 {
		t.Errorf("dispersion %.0f km/s", sigma)
	}
}

func BenchmarkMotions(b *testing.B) {
	for b.Loop() {
		equilibrium.Motions(Motions{Members: 500, Radius: 0.005}, rand.New(rand.NewPCG(3, 4)))
	}
}
