package lensing

import (
	"math"

	"steelyard/probes/halo"
)

const arcsec = math.Pi / 180 / 3600

// roundest is the ellipticity of a potential at which its surface density is no
// longer anything like an ellipse: above about 0.25 the contours of an NFW halo
// are waisted (Golse & Kneib 2002, A&A 390, 821).
const roundest = 0.3

// bending is the deflection of light at one place and its derivatives, for a
// source at infinity: α in radians, and the Hessian of the potential.
type bending struct{ x, y, xx, xy, yy float64 }

// shape is the place and the ellipticity of a lens. Its potential is that of a
// round lens, ψ(ρ), on ellipses (Golse & Kneib 2002):
//
//	ρ² = rᵀ Q r,   Q = [1−ε₁, −ε₂; −ε₂, 1+ε₁],
//
// ε₁ = ε cos 2φ, ε₂ = ε sin 2φ, φ the direction of the major axis, counted from
// east towards north. The axes of the potential are in the ratio
// √((1−ε)/(1+ε)); those of the surface density differ by about three times as
// much. The mass inside a circle is that of the round lens but for terms in ε².
type shape struct{ x, y, e1, e2 float64 }

// add adds what a lens of this shape bends at (x, y), all in radians. It is
// linear in scale, the inverse of Σ_cr; distance is in kpc per radian.
//
//	α = κ̄ Q r,   ∂α = κ̄ Q + 2 (κ − κ̄) (Q r)(Q r)ᵀ/ρ²,
//
// with κ and its mean κ̄ of the round lens at ρ.
func (s shape) add(b *bending, projected func(R float64) (surface, mean float64), x, y, scale, distance float64) {
	x, y = x-s.x, y-s.y
	qx, qy := (1-s.e1)*x-s.e2*y, (1+s.e1)*y-s.e2*x
	// A thousandth of an arcsecond keeps the centre finite.
	rho2 := x*qx + y*qy + 1e-6*arcsec*arcsec
	kappa, mean := projected(math.Sqrt(rho2) * distance)
	kappa, mean = scale*kappa, scale*mean
	steep := 2 * (kappa - mean) / rho2
	b.x += mean * qx
	b.y += mean * qy
	b.xx += mean*(1-s.e1) + steep*qx*qx
	b.xy += -mean*s.e2 + steep*qx*qy
	b.yy += mean*(1+s.e1) + steep*qy*qy
}

// truncated is an isothermal sphere with a core that is cut off outside: the
// density falls as r⁻² between the core and the cut and as r⁻⁴ beyond,
//
//	ρ = σ²/(2πG) [1/(r² + r_c²) − 1/(r² + r_t²)]
//
// (Kneib et al. 1996, ApJ 471, 643).
type truncated struct{ whole, outside halo.CoredIsothermal }

func newTruncated(sigma, core, cut float64) truncated {
	return truncated{halo.CoredIsothermal{Sigma: sigma, Core: core}, halo.CoredIsothermal{Sigma: sigma, Core: cut}}
}

// Projected returns Σ(R) and its mean inside R.
func (h truncated) Projected(R float64) (surface, mean float64) {
	return h.whole.SurfaceDensity(R) - h.outside.SurfaceDensity(R),
		h.whole.MeanSurfaceDensity(R) - h.outside.MeanSurfaceDensity(R)
}

// Mass is M(<r).
func (h truncated) Mass(r float64) float64 { return h.whole.Mass(r) - h.outside.Mass(r) }

// deflector is everything that bends light, at one point of parameter space.
type deflector struct {
	distance   float64 // kpc per radian
	main       halo.Model
	place      shape
	scale      float64 // of the halo: elongation over Σ_cr of a source at infinity
	galaxies   []truncated
	places     []shape
	critical   float64 // Σ_cr of a source at infinity, Msun/kpc²
	shear      [2]float64
	efficiency float64 // multiplies β of every source
}

// at is the deflection at (x, y) of a source of efficiency beta.
func (d *deflector) at(x, y, beta float64) bending {
	var b bending
	d.place.add(&b, func(R float64) (float64, float64) { return halo.Projected(d.main, R) }, x, y, d.scale, d.distance)
	for i, g := range d.galaxies {
		d.places[i].add(&b, g.Projected, x, y, 1/d.critical, d.distance)
	}
	g1, g2 := d.shear[0], d.shear[1]
	b.x += g1*x + g2*y
	b.y += g2*x - g1*y
	b.xx += g1
	b.xy += g2
	b.yy -= g1
	beta *= d.efficiency
	return bending{beta * b.x, beta * b.y, beta * b.xx, beta * b.xy, beta * b.yy}
}

// symmetric is a matrix [a, b; b, c].
type symmetric struct{ a, b, c float64 }

func (m symmetric) det() float64 { return m.a*m.c - m.b*m.b }

func (m symmetric) times(x, y float64) (float64, float64) { return m.a*x + m.b*y, m.b*x + m.c*y }

func (m symmetric) inverse() symmetric {
	d := m.det()
	return symmetric{m.c / d, -m.b / d, m.a / d}
}

func (m symmetric) square() symmetric {
	return symmetric{m.a*m.a + m.b*m.b, m.b * (m.a + m.c), m.b*m.b + m.c*m.c}
}

// root is the positive root of a positive definite matrix.
func (m symmetric) root() symmetric {
	s := math.Sqrt(m.det())
	t := math.Sqrt(m.a + m.c + 2*s)
	return symmetric{(m.a + s) / t, m.b / t, (m.c + s) / t}
}

// source maps a place back to the source plane: θ − α, and the matrix of its
// derivatives, the inverse of which magnifies.
func (d *deflector) source(x, y, beta float64) (sx, sy float64, jacobian symmetric) {
	b := d.at(x, y, beta)
	return x - b.x, y - b.y, symmetric{1 - b.xx, -b.xy, 1 - b.yy}
}
