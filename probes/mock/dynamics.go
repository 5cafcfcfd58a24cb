package mock

import (
	"math"
	"math/rand/v2"

	"steelyard/probes/constants"
)

// Motions says what catalogue of galaxy redshifts to invent. Members follow the
// mass of the halo out to Reach times R200. On isotropic orbits they are in exact
// equilibrium; with an anisotropy their velocities are normal, with the variances
// of the Jeans equation. Galaxies that merely fall in and galaxies of the field,
// spread evenly over sky and velocity, can be mixed in.
type Motions struct {
	Members       int
	Infalling     int     // between 1 and 5 R200, on their way in
	Field         int     // unrelated, before and behind
	Radius        float64 // of the round area on the sky, radians
	Reach         float64 // in units of R200; 0 stands for 5
	Anisotropy    float64 // β = 1 − σ_t²/σ_r² of the members, the same everywhere
	Window        float64 // km/s on both sides that field galaxies fill; 0 stands for 6000
	RedshiftError float64 // standard deviation, of every galaxy
}

// MotionCatalogue holds one entry a galaxy, in random order; angles in radians.
type MotionCatalogue struct {
	RA, Dec, Redshift, Error []float64
	Member                   []bool // the truth: a galaxy of the halo
}

// Motions invents a catalogue. Equal streams give equal catalogues.
func (t Truth) Motions(m Motions, rng *rand.Rand) *MotionCatalogue {
	if m.Reach == 0 {
		m.Reach = 5
	}
	if m.Window == 0 {
		m.Window = 6000
	}
	frame := newFrame(t.RA, t.Dec)
	distance := t.AngularDiameter(t.Redshift)
	c := new(MotionCatalogue)
	add := func(R, velocity float64, member bool) {
		ra, dec, _, _ := frame.place(R/distance, 2*math.Pi*rng.Float64())
		z := t.Redshift + (1+t.Redshift)*velocity/constants.SpeedOfLight
		c.RA, c.Dec = append(c.RA, ra), append(c.Dec, dec)
		c.Redshift = append(c.Redshift, z+m.RedshiftError*rng.NormFloat64())
		c.Error = append(c.Error, m.RedshiftError)
		c.Member = append(c.Member, member)
	}
	orbits := t.Halo().orbits()
	edge := m.Radius * distance
	variance := orbits.radialVariance(m.Anisotropy)
	for n := 0; n < m.Members; {
		r := orbits.radius(m.Reach*t.R200(), rng)
		sin := sinOfRandomAngle(rng)
		if r*sin >= edge {
			continue
		}
		n++
		if m.Anisotropy == 0 {
			// Any direction of the velocity serves as line of sight.
			add(r*sin, orbits.speed(r, rng)*(2*rng.Float64()-1), true)
			continue
		}
		along := lookup(orbits.lnR, variance, math.Log(r)) * (1 - m.Anisotropy*sin*sin)
		add(r*sin, math.Sqrt(along)*rng.NormFloat64(), true)
	}
	for n := 0; n < m.Infalling; {
		r := t.R200() * (1 + 4*rng.Float64())
		cos := 2*rng.Float64() - 1
		if R := r * math.Sqrt(1-cos*cos); R < edge {
			add(R, t.infall(r)*cos+0.3*t.circular200()*rng.NormFloat64(), false)
			n++
		}
	}
	for range m.Field {
		add(edge*math.Sqrt(rng.Float64()), m.Window*(2*rng.Float64()-1), false)
	}
	rng.Shuffle(len(c.RA), func(i, j int) {
		for _, column := range [][]float64{c.RA, c.Dec, c.Redshift, c.Error} {
			column[i], column[j] = column[j], column[i]
		}
		c.Member[i], c.Member[j] = c.Member[j], c.Member[i]
	})
	return c
}

// sinOfRandomAngle is the sine of the angle between a random direction and the
// line of sight.
func sinOfRandomAngle(rng *rand.Rand) float64 {
	cos := 2*rng.Float64() - 1
	return math.Sqrt(1 - cos*cos)
}

// circular200 is the circular speed at R200 in km/s.
func (t Truth) circular200() float64 { return math.Sqrt(constants.G * t.M200 / t.R200()) }

// infall is the radial velocity in km/s of galaxies that fall in for the first
// time at r kpc: the expansion less a speed that falls with the square root of
// the radius. It is a sketch and has no source.
func (t Truth) infall(r float64) float64 {
	return t.expansion(t.Redshift)/1000*r - 1.2*t.circular200()*math.Sqrt(t.R200()/r)
}

// orbits is the isotropic equilibrium of a halo: positions that follow its mass
// and speeds from the distribution function f(ε) of Eddington 1916,
//
//	f(ε) = 1/(√8 π²) d/dε ∫_0^ε (dρ/dψ) dψ/√(ε−ψ),
//
// every integral a sum over a grid of radii.
type orbits struct {
	lnR  []float64 // ln of kpc, rising, evenly spaced
	mass []float64 // Msun inside
	rho  []float64 // Msun/kpc³
	psi  []float64 // relative potential, (km/s)², falling
	f    []float64 // distribution function at ε = psi, any units
}

const (
	orbitFrom = 1e-4 // radii in units of r_s
	orbitTo   = 1e4
	orbitGrid = 1500
)

func (h *Halo) orbits() *orbits {
	o := &orbits{}
	step := math.Log(orbitTo/orbitFrom) / (orbitGrid - 1)
	rho := make([]float64, orbitGrid)
	o.rho = rho
	shell := func(r float64) float64 { return 4 * math.Pi * r * r * r * h.Density(r) } // dM/d ln r
	for i := range rho {
		ln := math.Log(orbitFrom*h.Rs) + float64(i)*step
		r := math.Exp(ln)
		rho[i] = h.Density(r)
		o.lnR = append(o.lnR, ln)
		if i == 0 {
			// ρ ∝ 1/r inside the grid.
			o.mass = append(o.mass, 2*math.Pi*r*r*r*rho[0])
			continue
		}
		// Simpson's rule over the step.
		last := math.Exp(ln - step)
		o.mass = append(o.mass, o.mass[i-1]+step/6*(shell(last)+4*shell(math.Exp(ln-step/2))+shell(r)))
	}
	o.psi = make([]float64, orbitGrid)
	// Beyond the grid M grows by 4πρr³ with each e-folding: ∫ G M dr/r².
	n := orbitGrid - 1
	end := math.Exp(o.lnR[n])
	o.psi[n] = constants.G / end * (o.mass[n] + shell(end))
	for i := n - 1; i >= 0; i-- {
		a, b := math.Exp(o.lnR[i]), math.Exp(o.lnR[i+1])
		// The mean of G M/r over the step in ln r.
		o.psi[i] = o.psi[i+1] + step*constants.G*(o.mass[i]/a+o.mass[i+1]/b)/2
	}
	o.f = eddington(o.psi, rho)
	return o
}

// radialVariance is σ_r² in (km/s)² along the grid for a constant anisotropy:
//
//	ρ r^2β σ_r² = ∫_r^∞ ρ s^2β G M ds/s²,
//
// added up by the trapezoidal rule from outside.
func (o *orbits) radialVariance(beta float64) []float64 {
	n := len(o.lnR)
	out := make([]float64, n)
	pull := func(i int) float64 {
		return o.rho[i] * math.Exp((2*beta-1)*o.lnR[i]) * constants.G * o.mass[i]
	}
	step, sum := o.lnR[1]-o.lnR[0], 0.0
	for i := n - 2; i >= 0; i-- {
		sum += step * (pull(i) + pull(i+1)) / 2
		out[i] = sum / (o.rho[i] * math.Exp(2*beta*o.lnR[i]))
	}
	return out
}

// eddington inverts ρ(ψ), both given along falling ψ. Between the points ρ is
// taken as linear in ψ, for which the integral is elementary, and its derivative
// is the difference of neighbours.
func eddington(psi, rho []float64) []float64 {
	n := len(psi)
	integral := make([]float64, n)
	for i := range integral {
		// Below the last point ρ falls to zero at ψ = 0.
		slope := rho[n-1] / psi[n-1]
		sum := slope * (math.Sqrt(psi[i]) - math.Sqrt(psi[i]-psi[n-1]))
		for j := n - 2; j >= i; j-- {
			slope = (rho[j] - rho[j+1]) / (psi[j] - psi[j+1])
			sum += slope * (math.Sqrt(psi[i]-psi[j+1]) - math.Sqrt(psi[i]-psi[j]))
		}
		integral[i] = 2 * sum
	}
	f := make([]float64, n)
	for i := 1; i+1 < n; i++ {
		f[i] = math.Max(0, (integral[i-1]-integral[i+1])/(psi[i-1]-psi[i+1]))
	}
	f[0], f[n-1] = f[1], f[n-2]
	return f
}

// radius draws a radius inside end kpc, following the mass.
func (o *orbits) radius(end float64, rng *rand.Rand) float64 {
	return math.Exp(invert(o.mass, o.lnR, rng.Float64()*lookup(o.lnR, o.mass, math.Log(end))))
}

// speed draws a speed in km/s at r kpc from v² f(ψ − v²/2).
func (o *orbits) speed(r float64, rng *rand.Rand) float64 {
	const steps = 200
	psi := lookup(o.lnR, o.psi, math.Log(r))
	top := math.Sqrt(2 * psi)
	var v, below [steps + 1]float64
	for k := 1; k <= steps; k++ {
		v[k] = top * float64(k) / steps
		mid := v[k] - top/steps/2
		below[k] = below[k-1] + mid*mid*o.density(psi-mid*mid/2)
	}
	return invert(below[:], v[:], rng.Float64()*below[steps])
}

// density is f(ε).
func (o *orbits) density(energy float64) float64 {
	n := len(o.psi)
	if energy <= o.psi[n-1] {
		return 0
	}
	lo, hi := 0, n-1 // psi[lo] ≥ energy > psi[hi]
	for hi-lo > 1 {
		if mid := (lo + hi) / 2; o.psi[mid] >= energy {
			lo = mid
		} else {
			hi = mid
		}
	}
	part := (energy - o.psi[hi]) / (o.psi[lo] - o.psi[hi])
	return o.f[hi] + math.Min(1, part)*(o.f[lo]-o.f[hi])
}

// lookup reads y at x between evenly spaced, rising xs.
func lookup(xs, y []float64, x float64) float64 {
	return interpolate(y, (x-xs[0])/(xs[1]-xs[0]))
}

// invert finds where the rising cumulative ys reach y, linearly between points.
func invert(ys, xs []float64, y float64) float64 {
	lo, hi := 0, len(ys)-1
	for hi-lo > 1 {
		if mid := (lo + hi) / 2; ys[mid] <= y {
			lo = mid
		} else {
			hi = mid
		}
	}
	if ys[hi] == ys[lo] {
		return xs[lo]
	}
	return xs[lo] + math.Min(1, math.Max(0, (y-ys[lo])/(ys[hi]-ys[lo])))*(xs[hi]-xs[lo])
}
