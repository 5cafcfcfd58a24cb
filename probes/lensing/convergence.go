package lensing

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/integrate/quad"
	"gonum.org/v1/gonum/interp"

	"steelyard/probes/constants"
)

// convergence is the power spectrum of the convergence of sources at one
// redshift.
type convergence struct{ lnPower interp.NaturalCubic }

// The multipoles of the table, and how many steps it has between.
const lowest, highest, multipoleSteps = 1.0, 1e6, 120

// convergence projects the matter in front of sources at redshift source, in
// the flat-sky approximation of Limber (Kaiser 1992):
//
//	P_κ(l) = ∫ dχ (W/f)² P(l/f, z),   W = (3/2) Ω_m (H0/c)² (1+z) f β(z, z_s),
//
// f being the transverse comoving distance at χ and β = D_ls/D_s the efficiency
// of a lens there.
func (s *spectrum) convergence(source float64) (*convergence, error) {
	if !(source > 0 && source < 1100) {
		return nil, fmt.Errorf("sources at redshift %g", source)
	}
	const n = 48
	z, w := make([]float64, n), make([]float64, n)
	quad.Legendre{}.FixedLocations(z, w, 0, source)
	type plane struct{ z, distance, weight float64 }
	planes := make([]plane, n)
	q := s.background.Params()
	hubble := q.HubbleConstant / constants.SpeedOfLight // 1/Mpc
	for i := range planes {
		f := s.background.TransverseComoving(z[i]) / 1000
		kernel := 1.5 * q.OmegaMatter * hubble * hubble * (1 + z[i]) * s.background.Efficiency(z[i], source)
		// dχ = c dz/H
		planes[i] = plane{z[i], f, kernel * kernel * w[i] * constants.SpeedOfLight / s.background.H(z[i])}
	}
	lnL, lnP := make([]float64, multipoleSteps+1), make([]float64, multipoleSteps+1)
	for i := range lnL {
		lnL[i] = math.Log(lowest) + math.Log(highest/lowest)*float64(i)/multipoleSteps
		sum := 0.0
		for _, p := range planes {
			sum += p.weight * s.power(math.Exp(lnL[i])/p.distance, p.z)
		}
		lnP[i] = math.Log(sum)
	}
	c := new(convergence)
	if err := c.lnPower.Fit(lnL, lnP); err != nil {
		return nil, fmt.Errorf("%w", err)
	}
	return c, nil
}

// power is P_κ at multipole l, between 1 and 1e6.
func (c *convergence) power(l float64) float64 { return math.Exp(c.lnPower.Predict(math.Log(l))) }

// shearCovariance is the covariance of the mean tangential shear in annuli of
// inner and outer radii in radians (equal ones stand for circles), row by row
// (Hoekstra 2003, MNRAS 339, 1155):
//
//	C_ij = (1/2π) ∫ l dl P_κ(l) g_i(l) g_j(l),   g = 2/(b²−a²) ∫_a^b J₂(lθ) θ dθ.
func (c *convergence) shearCovariance(inner, outer []float64) []float64 {
	n := len(inner)
	out, g := make([]float64, n*n), make([]float64, n)
	widest := outer[n-1]
	for l := lowest; l < highest; {
		// Fine against the power spectrum, and against the fastest wave.
		step := min(0.02*l, 0.3/widest)
		for i := range g {
			g[i] = meanJ2(l+step/2, inner[i], outer[i])
		}
		w := (l + step/2) * c.power(l+step/2) * step / (2 * math.Pi)
		for i := range n {
			for j := range i + 1 {
				out[i*n+j] += w * g[i] * g[j]
			}
		}
		l += step
		// What is left is 1e-3 of the whole and less: g² falls as 1/l³ and P_κ as 1/l.
		if l*inner[0] > 100 {
			break
		}
	}
	for i := range n {
		for j := range i {
			out[j*n+i] = out[i*n+j]
		}
	}
	return out
}

// meanJ2 is the mean of J₂(lθ) over the annulus a ≤ θ ≤ b, in closed form by
// ∫ x J₂ dx = −x J₁ − 2 J₀.
func meanJ2(l, a, b float64) float64 {
	if (b-a)*l < 1e-3*max(1, a*l) { // the difference below would lose its digits
		return math.Jn(2, l*(a+b)/2)
	}
	f := func(x float64) float64 {
		if x < 1e-2 {
			return -2 + x*x*x*x/32 // −x J₁ − 2J₀ = −2 + x⁴/32 − …
		}
		return -x*math.J1(x) - 2*math.J0(x)
	}
	if b*l < 0.02 {
		return l * l * (a*a + b*b) / 16 // J₂ = x²/8
	}
	return 2 * (f(b*l) - f(a*l)) / (l * l * (b*b - a*a))
}
