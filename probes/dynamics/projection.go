package dynamics

import (
	"math"
	"sync"

	"gonum.org/v1/gonum/integrate/quad"

	"steelyard/probes/constants"
)

// sphere solves the Jeans equation of a spherical system on a grid of radii and
// projects it. It holds the space for one solution and is reused from one point
// of parameter space to the next.
//
// With ν the density of the tracers, M the mass and β(r) the anisotropy,
//
//	ν σ_r² = (1/g) ∫_r^∞ g ν G M/s² ds,   ln g = 2 ∫ β dr/r,
//	Σ σ_los² = 2 ∫_R^∞ (1 − β R²/r²) ν σ_r² r dr/√(r² − R²)
//
// (Binney & Mamon 1982; Mamon & Łokas 2005). For the forms of β used here g is
// elementary. Both integrals run over ln r; the second, with its square root,
// has weights that depend on r/R alone and are computed once.
type sphere struct {
	lnFrom    float64   // ln of the first radius, kpc
	radii     []float64 // gridStep apart in the logarithm
	stretched float64   // what stretch was last asked for
	wanted    int       // radii at which σ_los is tabulated: every other one of the first wanted

	force    []float64 // g ν G M/r
	pressure []float64 // r³ ν σ_r²
	radial   []float64 // r³ β ν σ_r²
	variance []float64 // σ_los², tabulated at every other radius
}

const (
	gridStep = 0.1
	// gridReach is how far the line of sight is followed, in e-foldings of r/R;
	// the integrand falls at least as e^(−2 s), leaving 1e-6.
	gridReach = 70
)

// stretch moves the grid outwards by a factor from where it was made.
func (s *sphere) stretch(factor float64) {
	if s.stretched == factor {
		return
	}
	for i := range s.radii {
		s.radii[i] *= factor / s.stretched
	}
	s.lnFrom += math.Log(factor / s.stretched)
	s.stretched = factor
}

// newSphere makes room for σ_los between two projected radii in kpc.
func newSphere(from, to float64) *sphere {
	s := &sphere{lnFrom: math.Log(from), stretched: 1}
	s.wanted = 2*int(math.Ceil((math.Log(to)-s.lnFrom)/(2*gridStep))) + 1
	s.wanted = max(s.wanted, 7)
	n := s.wanted + gridReach
	for i := range n {
		s.radii = append(s.radii, from*math.Exp(gridStep*float64(i)))
	}
	s.force, s.pressure, s.radial = make([]float64, n), make([]float64, n), make([]float64, n)
	s.variance = make([]float64, (s.wanted+1)/2)
	return s
}

// orbits is the anisotropy β(r) = 1 − σ_t²/σ_r² of a system, with ln g(r) of its
// Jeans equation.
type orbits interface {
	beta(r float64) float64
	g(r float64) float64
}

// constantOrbits have the same β everywhere.
type constantOrbits float64

func (b constantOrbits) beta(float64) float64 { return float64(b) }
func (b constantOrbits) g(r float64) float64  { return math.Exp(2 * float64(b) * math.Log(r)) }

// radialOutside is β = r²/(r² + r_a²) of Osipkov 1979 and Merritt 1985, its value
// r_a in kpc.
type radialOutside float64

func (a radialOutside) beta(r float64) float64 { return r * r / (r*r + float64(a)*float64(a)) }
func (a radialOutside) g(r float64) float64    { return r*r + float64(a)*float64(a) }

// risingOrbits is β = β_∞ r/(r + r_s) of Tiret et al. 2007.
type risingOrbits struct{ outer, scale float64 }

func (o risingOrbits) beta(r float64) float64 { return o.outer * r / (r + o.scale) }
func (o risingOrbits) g(r float64) float64    { return math.Exp(2 * o.outer * math.Log(r+o.scale)) }

// solve tabulates σ_los² in (km/s)² for tracers of density and projected density
// in any unit, a mass in Msun and the orbits.
func (s *sphere) solve(density, surface, mass func(r float64) float64, o orbits) {
	n := len(s.radii)
	for i, r := range s.radii {
		g := o.g(r)
		// radial holds 1/g until the pressure is known.
		s.force[i], s.radial[i] = g*density(r)*constants.G*mass(r)/r, r*r*r/g
	}
	// Beyond the grid the force goes on as a power of r.
	slope := math.Log(s.force[n-2]/s.force[n-1]) / gridStep
	sum := s.force[n-1] / slope
	for i := n - 1; i >= 0; i-- {
		if i < n-1 {
			sum += s.step(i)
		}
		s.pressure[i] = sum * s.radial[i]
		s.radial[i] = s.pressure[i] * o.beta(s.radii[i])
	}
	w := projectionWeights()
	for k := range s.variance {
		i := 2 * k
		along, across := 0.0, 0.0
		pressure, radial := s.pressure[i:i+len(w.along)], s.radial[i:i+len(w.along)]
		for m := range w.along {
			along += w.along[m] * pressure[m]
			across += w.across[m] * radial[m]
		}
		R := s.radii[i]
		s.variance[k] = 2 * (along - across) / (R * R * surface(R))
	}
}

// step integrates the force over ln r from point i to the next.
func (s *sphere) step(i int) float64 {
	first := min(max(i-stencil/2+1, 0), len(s.force)-stencil)
	w, f := stepWeights()[i-first], s.force[first:first+stencil]
	return w[0]*f[0] + w[1]*f[1] + w[2]*f[2] + w[3]*f[3] + w[4]*f[4] + w[5]*f[5]
}

// stencil is the number of grid points through which functions are taken as
// polynomials between two of them.
const stencil = 6

// stepWeights are those of ∫ f dx over one step of the grid, for each place of
// the step in the stencil. f e^(2x) and not f, which falls as e^(−3x) to e^(−5x),
// is taken as the polynomial.
var stepWeights = sync.OnceValue(func() [stencil - 1][stencil]float64 {
	var w [stencil - 1][stencil]float64
	for place := range w {
		for m := range stencil {
			w[place][m] = quad.Fixed(func(x float64) float64 {
				return lagrange(x, m) * math.Exp(2*gridStep*(float64(m)-x)) * gridStep
			}, float64(place), float64(place+1), 12, nil, 0)
		}
	}
	return w
})

// weights are those of the projection,
//
//	along   ∫ r² f dr/(R² √(r² − R²)) = ∫ e^(−s) p ds/√(e^(2s) − 1)
//	across  the same with e^(−3s)
//
// for f = p/r³ of which p is given at s = ln r/R = 0, h, 2h, …
type weights struct{ along, across []float64 }

var projectionWeights = sync.OnceValue(func() weights {
	w := weights{make([]float64, gridReach), make([]float64, gridReach)}
	for k := 0; k+1 < gridReach; k++ {
		first := min(max(k-stencil/2+1, 0), gridReach-stencil)
		for m := range stencil {
			share := func(falls float64) float64 {
				// t² = s − kh takes out the root at 0.
				return quad.Fixed(func(t float64) float64 {
					s := float64(k)*gridStep + t*t
					return lagrange(s/gridStep-float64(first), m) * math.Exp(-falls*s) / math.Sqrt(math.Expm1(2*s)) * 2 * t
				}, 0, math.Sqrt(gridStep), 16, nil, 0)
			}
			w.along[first+m] += share(1)
			w.across[first+m] += share(3)
		}
	}
	return w
})

// lagrange is the polynomial that is 1 at point m of the stencil and 0 at the
// others.
func lagrange(x float64, m int) float64 {
	p := 1.0
	for k := range stencil {
		if k != m {
			p *= (x - float64(k)) / float64(m-k)
		}
	}
	return p
}
