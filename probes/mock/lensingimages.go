package mock

import (
	"math"
	"math/rand/v2"

	"steelyard/probes/constants"
)

// Arcs says what multiple images to invent: sources behind an NFW halo of
// elliptical potential with an even shear. Angles in radians.
type Arcs struct {
	Redshifts      []float64 // of the sources, one a family
	Error          float64   // of the places, in each coordinate
	Ellipticity    [2]float64
	Shear          [2]float64 // for a source at infinity
	Centre         [2]float64 // of the halo, east and north of the object's, kpc
	Fewest         int        // images of a family
	FaintestFactor float64    // images magnified less are not seen
}

// ArcCatalogue holds one entry an image; angles in radians.
type ArcCatalogue struct {
	Source            []int // number of the family
	RA, Dec, Redshift []float64
}

// Arcs invents families of images by solving the lens equation on a grid:
// the plane of the sky is cut into triangles, and an image lies in each triangle
// whose corners, mapped back, surround the source (Schneider, Ehlers & Falco
// 1992, §10; from memory). The deflection is the slope of a tabulated potential.
// Sources are even over the part of the square of the Einstein radius about the
// centre that has at least that many images.
func (t Truth) Arcs(a Arcs, rng *rand.Rand) *ArcCatalogue {
	l := t.lens()
	horizon := t.horizon(l)
	s := t.potential(a, l, horizon)
	frame := newFrame(t.RA, t.Dec)
	c := new(ArcCatalogue)
	for k, z := range a.Redshifts {
		far := l.distance(z)
		// D_ls/D_s in units of that of a source at infinity, in a flat universe.
		g := s.grid((far - l.near) / far / ((horizon - l.near) / horizon))
		for {
			sx, sy := s.width*(rng.Float64()-0.5), s.width*(rng.Float64()-0.5)
			images := g.images(sx, sy, a.FaintestFactor)
			if len(images) < a.Fewest {
				continue
			}
			for _, p := range images {
				x, y := p[0]+a.Error*rng.NormFloat64(), p[1]+a.Error*rng.NormFloat64()
				// From the plane that touches the sky.
				ra, dec, _, _ := frame.place(math.Atan(math.Hypot(x, y)), math.Atan2(x, y))
				c.Source = append(c.Source, k)
				c.RA, c.Dec, c.Redshift = append(c.RA, ra), append(c.Dec, dec), append(c.Redshift, z)
			}
			break
		}
	}
	return c
}

// potential is the lensing potential for a source at infinity, on ellipses.
type potential struct {
	arcs     Arcs
	distance float64   // kpc per radian
	lnRho    []float64 // radians
	psi      []float64
	slope    []float64 // dψ/d ln ρ
	width    float64   // half of the square that is searched, radians
}

func (t Truth) potential(a Arcs, l *lens, horizon float64) *potential {
	s := &potential{arcs: a, distance: l.near / (1 + t.Redshift)}
	// c²/(4πG) D_s/(D_l D_ls) for a source at infinity
	critical := constants.LensingMass / s.distance * horizon / (horizon - l.near)
	sum, last := 0.0, 0.0
	for i, lnR := range l.lnRadii {
		rho := math.Exp(lnR) / s.distance
		slope := l.mean[i] / critical * rho * rho
		if i > 0 { // trapezia are good to the square of the step, 1e-5
			sum += (slope + last) / 2 * (l.lnRadii[1] - l.lnRadii[0])
		}
		last = slope
		s.lnRho, s.psi, s.slope = append(s.lnRho, math.Log(rho)), append(s.psi, sum), append(s.slope, slope)
		if l.mean[i] > critical {
			s.width = 2 * rho // twice the Einstein radius of the farthest source
		}
	}
	return s
}

// horizon is the comoving distance to infinity: beyond the table there is matter
// alone, and the rest is 2c/H₀ (Ω_m (1+z))^(−½).
func (t Truth) horizon(l *lens) float64 {
	z := float64(len(l.comoving)-1) / perRedshift
	return l.distance(z) + 2000*constants.SpeedOfLight/t.HubbleConstant/math.Sqrt(t.OmegaMatter*(1+z))
}

// at is the potential at (x, y) for a source at infinity, by the cubic through
// the values and the slopes of the table.
func (s *potential) at(x, y float64) float64 {
	a := s.arcs
	shear := a.Shear[0]*(x*x-y*y)/2 + a.Shear[1]*x*y
	x, y = x-a.Centre[0]/s.distance, y-a.Centre[1]/s.distance
	e := math.Hypot(a.Ellipticity[0], a.Ellipticity[1])
	sin, cos := math.Sincos(math.Atan2(a.Ellipticity[1], a.Ellipticity[0]) / 2)
	along, across := cos*x+sin*y, cos*y-sin*x
	rho := math.Sqrt((1-e)*along*along + (1+e)*across*across)
	h := s.lnRho[1] - s.lnRho[0]
	at := (math.Log(rho) - s.lnRho[0]) / h
	i := min(max(int(at), 0), len(s.psi)-2)
	u := at - float64(i)
	v := 1 - u
	psi := s.psi[i]*v*v*(1+2*u) + s.psi[i+1]*u*u*(1+2*v) + h*u*v*(v*s.slope[i]-u*s.slope[i+1])
	return psi + shear
}

const difference = 0.003 * math.Pi / 180 / 3600 // over which slopes are taken

// source maps a place back to the source plane.
func (s *potential) source(x, y, beta float64) (sx, sy float64) {
	const h = difference
	return x - beta*(s.at(x+h, y)-s.at(x-h, y))/(2*h), y - beta*(s.at(x, y+h)-s.at(x, y-h))/(2*h)
}

// grid is the plane of the sky with its points mapped back.
type grid struct {
	potential *potential
	beta      float64
	n         int
	step      float64
	x, y      []float64 // in the source plane
}

func (s *potential) grid(beta float64) *grid {
	const n = 161
	g := &grid{potential: s, beta: beta, n: n, step: 2 * s.width / (n - 1)}
	for i := range n * n {
		x, y := g.place(i)
		sx, sy := s.source(x, y, beta)
		g.x, g.y = append(g.x, sx), append(g.y, sy)
	}
	return g
}

func (g *grid) place(i int) (x, y float64) {
	// Off the centre by part of a step, where a point would have no direction.
	return (float64(i%g.n)+0.37)*g.step - g.potential.width, (float64(i/g.n)+0.41)*g.step - g.potential.width
}

// images returns where a source at (sx, sy) is seen, magnified by more than
// faintest.
func (g *grid) images(sx, sy, faintest float64) [][2]float64 {
	var found [][2]float64
	for i := range g.n * (g.n - 1) {
		if i%g.n == g.n-1 {
			continue
		}
		for _, corners := range [2][3]int{{i, i + 1, i + g.n}, {i + 1, i + g.n, i + g.n + 1}} {
			if !g.surrounds(corners, sx, sy) {
				continue
			}
			x, y := 0.0, 0.0
			for _, c := range corners {
				cx, cy := g.place(c)
				x, y = x+cx/3, y+cy/3
			}
			p, magnified, ok := g.polish(x, y, sx, sy)
			for _, other := range found {
				ok = ok && math.Hypot(other[0]-p[0], other[1]-p[1]) > difference
			}
			if ok && magnified > faintest {
				found = append(found, p)
			}
		}
	}
	return found
}

// surrounds asks whether a source lies inside a triangle mapped back.
func (g *grid) surrounds(corners [3]int, sx, sy float64) bool {
	positive, negative := 0, 0
	for k := range 3 {
		a, b := corners[k], corners[(k+1)%3]
		if (g.x[b]-g.x[a])*(sy-g.y[a])-(g.y[b]-g.y[a])*(sx-g.x[a]) > 0 {
			positive++
		} else {
			negative++
		}
	}
	return positive == 0 || negative == 0
}

// polish moves an image by Newton's method to where it maps back to the source.
func (g *grid) polish(x, y, sx, sy float64) (p [2]float64, magnified float64, ok bool) {
	const h = 3 * difference
	for range 30 {
		ax, ay := g.potential.source(x+h, y, g.beta)
		bx, by := g.potential.source(x-h, y, g.beta)
		cx, cy := g.potential.source(x, y+h, g.beta)
		dx, dy := g.potential.source(x, y-h, g.beta)
		xx, yx, xy, yy := (ax-bx)/(2*h), (ay-by)/(2*h), (cx-dx)/(2*h), (cy-dy)/(2*h)
		det := xx*yy - xy*yx
		hereX, hereY := g.potential.source(x, y, g.beta)
		missX, missY := sx-hereX, sy-hereY
		moveX, moveY := (yy*missX-xy*missY)/det, (xx*missY-yx*missX)/det
		length := math.Hypot(moveX, moveY)
		if length < 1e-4*difference {
			return [2]float64{x, y}, 1 / math.Abs(det), true
		}
		shorten := min(1, g.step/length)
		x, y = x+shorten*moveX, y+shorten*moveY
	}
	return p, 0, false
}
