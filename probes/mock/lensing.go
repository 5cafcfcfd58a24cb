package mock

import (
	"math"
	"math/rand/v2"

	"steelyard/probes/constants"
)

// Shapes says what catalogue of galaxy shapes to invent. Sources are spread
// evenly over a round field about the object, at redshifts of density
//
//	n(z) ∝ z² exp(−(z/z0)^(3/2)),
//
// foreground included. Each has a random shape, an ellipticity (a−b)/(a+b)
// whose components have a standard deviation of the galaxy's own, which its
// weight follows: 1/σ².
type Shapes struct {
	Galaxies        int
	Field           float64 // radius, radians
	RedshiftScale   float64 // z0; the median is 1.41 z0
	RedshiftScatter float64 // of the photometric redshifts, in units of 1+z
	Quiet, Noisy    float64 // smallest and largest σ of one component, evenly spread between
	Dilution        float64 // fraction that is not sheared, whatever its redshift says
	ShearBias       float64 // m of g → (1+m) g
	Elongation      float64 // multiplies the projected mass; 0 stands for 1
	West            bool    // e1, e2 on an x axis pointing west instead of east
}

// ShapeCatalogue holds one entry a galaxy; angles in radians.
type ShapeCatalogue struct {
	RA, Dec, E1, E2, Weight, Redshift []float64
}

// Shapes invents a catalogue. Equal streams give equal catalogues.
func (t Truth) Shapes(s Shapes, rng *rand.Rand) *ShapeCatalogue {
	if s.Elongation == 0 {
		s.Elongation = 1
	}
	lens := t.lens()
	frame := newFrame(t.RA, t.Dec)
	distance := t.AngularDiameter(t.Redshift)
	c := new(ShapeCatalogue)
	for range s.Galaxies {
		angle := math.Acos(1 - rng.Float64()*(1-math.Cos(s.Field)))
		ra, dec, x, y := frame.place(angle, 2*math.Pi*rng.Float64())
		if s.West {
			x = -x
		}
		z := s.RedshiftScale * math.Pow(rng.ExpFloat64()+rng.ExpFloat64(), 2.0/3)
		sigma := s.Quiet + (s.Noisy-s.Quiet)*rng.Float64()
		e := roundShape(sigma, rng)
		if rng.Float64() >= s.Dilution {
			g := (1 + s.ShearBias) * lens.reducedShear(angle*distance, z, s.Elongation)
			// The image is drawn out across the direction (x, y) to the centre.
			e = sheared(e, complex(-g*(x*x-y*y), -g*2*x*y))
		}
		photometric := z + s.RedshiftScatter*(1+z)*rng.NormFloat64()
		for photometric <= 0 {
			photometric = z + s.RedshiftScatter*(1+z)*rng.NormFloat64()
		}
		c.RA, c.Dec = append(c.RA, ra), append(c.Dec, dec)
		c.E1, c.E2 = append(c.E1, real(e)), append(c.E2, imag(e))
		c.Weight = append(c.Weight, 1/(sigma*sigma))
		c.Redshift = append(c.Redshift, photometric)
	}
	return c
}

// roundShape draws a shape of random orientation, inside the unit circle.
func roundShape(sigma float64, rng *rand.Rand) complex128 {
	for {
		a, b := sigma*rng.NormFloat64(), sigma*rng.NormFloat64()
		if a*a+b*b < 1 {
			return complex(a, b)
		}
	}
}

// sheared is the image of a source of ellipticity e under a reduced shear g,
// exactly (Seitz & Schneider 1997, A&A 318, 687).
func sheared(e, g complex128) complex128 {
	conj := func(z complex128) complex128 { return complex(real(z), -imag(z)) }
	if real(g)*real(g)+imag(g)*imag(g) <= 1 {
		return (e + g) / (1 + conj(g)*e)
	}
	return (1 + g*conj(e)) / (conj(e) + conj(g))
}

// frame is the sky about a centre, in unit vectors.
type frame struct{ centre, east, north [3]float64 }

func newFrame(ra, dec float64) frame {
	sa, ca := math.Sincos(ra)
	sd, cd := math.Sincos(dec)
	return frame{
		centre: [3]float64{cd * ca, cd * sa, sd},
		east:   [3]float64{-sa, ca, 0},
		north:  [3]float64{-sd * ca, -sd * sa, cd},
	}
}

// place goes an angle from the centre at a position angle counted from north
// through east. It returns where that is, and the direction of travel there on
// the axes east (x) and north (y) of that place.
func (f frame) place(angle, position float64) (ra, dec, x, y float64) {
	sp, cp := math.Sincos(position)
	s, c := math.Sincos(angle)
	var at, travel [3]float64
	for i := range at {
		out := sp*f.east[i] + cp*f.north[i]
		at[i] = c*f.centre[i] + s*out
		travel[i] = -s*f.centre[i] + c*out
	}
	ra, dec = math.Atan2(at[1], at[0]), math.Atan2(at[2], math.Hypot(at[0], at[1]))
	if ra < 0 {
		ra += 2 * math.Pi
	}
	there := newFrame(ra, dec)
	for i := range travel {
		x += travel[i] * there.east[i]
		y += travel[i] * there.north[i]
	}
	return ra, dec, x, y
}

// lens is a halo projected by adding up its density along lines of sight.
type lens struct {
	lnRadii  []float64 // kpc, evenly spaced
	surface  []float64 // Msun/kpc²
	mean     []float64 // mean surface density inside
	redshift float64
	near     float64   // comoving distance of the lens, kpc
	comoving []float64 // comoving distance at redshift i/perRedshift
}

const perRedshift = 1000

// lens projects the halo between 1e-3 kpc and 30 Mpc. The sums err by 1e-5.
func (t Truth) lens() *lens {
	const n, inner, outer = 1600, 1e-3, 3e4
	h, path := t.Halo(), newPath()
	l := &lens{redshift: t.Redshift, comoving: []float64{0}}
	step := math.Log(outer/inner) / (n - 1)
	var inside, last float64 // Σ R² integrated over ln R; its integrand
	for i := range n {
		lnR := math.Log(inner) + float64(i)*step
		r := math.Exp(lnR)
		surface := path.surfaceDensity(h, r)
		integrand := surface * r * r
		if i == 0 {
			inside = integrand / 2 // a flat core inside 1 pc
		} else { // Simpson's rule
			between := r * math.Exp(-step/2)
			inside += (integrand + 4*path.surfaceDensity(h, between)*between*between + last) / 6 * step
		}
		last = integrand
		l.lnRadii = append(l.lnRadii, lnR)
		l.surface = append(l.surface, surface)
		l.mean = append(l.mean, 2*inside/(r*r))
	}
	sum := 0.0
	for i := range 20 * perRedshift {
		sum += constants.SpeedOfLight * 1000 / t.expansion((float64(i)+0.5)/perRedshift) / perRedshift
		l.comoving = append(l.comoving, sum)
	}
	l.near = l.distance(t.Redshift)
	return l
}

// path is a line of sight in steps of u, with r = R cosh u at the distance R
// from the centre and dl = R cosh u du: the values of cosh u, to 1e8.
type path []float64

const pathStep = 0.05

func newPath() path {
	var p path
	for i := range 380 {
		p = append(p, math.Cosh((float64(i)+0.5)*pathStep))
	}
	return p
}

// surfaceDensity adds up the density along the path on both sides of the lens.
func (p path) surfaceDensity(h *Halo, R float64) float64 {
	sum := 0.0
	for _, c := range p {
		sum += h.Density(R*c) * c
	}
	return 2 * R * sum * pathStep
}

// distance is the comoving distance to redshift z in kpc.
func (l *lens) distance(z float64) float64 { return interpolate(l.comoving, z*perRedshift) }

// reducedShear is γ/(1−κ) at R kpc of a source at redshift z, the projected
// mass multiplied by elongation; 0 when the source is not behind the lens.
func (l *lens) reducedShear(R, z, elongation float64) float64 {
	if z <= l.redshift {
		return 0
	}
	far := l.distance(z)
	// c²/(4πG) · D_s/(D_l D_ls), in a flat universe
	critical := constants.LensingMass * (1 + l.redshift) / l.near * far / (far - l.near)
	at := (math.Log(R) - l.lnRadii[0]) / (l.lnRadii[1] - l.lnRadii[0])
	kappa := elongation * interpolate(l.surface, at) / critical
	mean := elongation * interpolate(l.mean, at) / critical
	return (mean - kappa) / (1 - kappa)
}

// interpolate reads a table between its entries, and at its ends beyond them.
func interpolate(table []float64, at float64) float64 {
	i := min(max(int(at), 0), len(table)-2)
	f := min(max(at-float64(i), 0), 1)
	return table[i]*(1-f) + table[i+1]*f
}
