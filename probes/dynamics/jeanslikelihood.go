package dynamics

import (
	"math"

	"steelyard/probes/halo"
)

// likelihood returns the log likelihood of theta with space of its own. With the
// share f of field galaxies, even over the annulus and over |v| < L, the density
// of a galaxy over R and v is
//
//	p = (1−f) 2πR Σ(R)/N · normal(v) + f 2πR/A · 1/2L,
//
// the normal cut off at L where velocities beyond it were rejected. In a sample
// of uneven completeness the positions count with their weights w, the
// velocities, whose density at a given R completeness does not change, once:
//
//	ln L = Σ w ln p(R) + ln p(v|R).
func (f *jeansFit) likelihood() func(theta []float64) float64 {
	d := &f.data
	space := newSphere(max(d.from, math.Max(1, d.to/1000)), d.to)
	// Σ/N and σ_los² over ln R; the radii of the model are e times those seen.
	members := table{space.lnFrom, 2 * gridStep, make([]float64, len(space.variance))}
	variance := table{space.lnFrom, 2 * gridStep, space.variance}
	area := math.Pi * (d.to*d.to - d.from*d.from)
	return func(theta []float64) float64 {
		h, r200, inner, ok := f.model.at(theta)
		ct, share, b, e := f.tracer.Of(theta), f.field.Of(theta), f.bias.Of(theta), f.elongation.Of(theta)
		if !ok || !(ct > 0) || !(share >= 0 && share <= 1) || !(b > 0) || !(e > 0) {
			return math.Inf(-1)
		}
		o, ok := f.orbitsAt(theta, inner)
		if !ok {
			return math.Inf(-1)
		}
		tracer := halo.NFW{RhoS: 1, Rs: r200 / ct}
		// A halo drawn out along the line of sight looks smaller by the elongation
		// and faster by its power 8/5 (see varianceElongation).
		space.stretch(e)
		space.solve(tracer.Density, tracer.SurfaceDensity, h.Mass, o)
		number := tracer.ProjectedMass(d.to * e)
		if d.from > 0 {
			number -= tracer.ProjectedMass(d.from * e)
		}
		number /= e * e
		faster := b * b * math.Pow(e, varianceElongation)
		for k := range variance.values {
			members.values[k] = tracer.SurfaceDensity(space.radii[2*k]) / number
			variance.values[k] *= faster
		}
		if !(number > 0) {
			return math.Inf(-1)
		}
		return d.logLikelihood(f.velocity.Of(theta), share, 1/area, members, variance)
	}
}

// logLikelihood adds up the galaxies. Factors that hang on no parameter, 2πR, are
// left out.
func (d *phaseSpace) logLikelihood(mean, share, even float64, members, variance table) float64 {
	sum, product, field := 0.0, 1.0, share*even
	scale := d.to * d.to * 1e3 // keeps the product of densities near 1
	for i, lnR := range d.lnR {
		k, w := members.place(lnR)
		m, s2 := members.values[k:k+4], variance.values[k:k+4]
		inside := (1 - share) * (w[0]*m[0] + w[1]*m[1] + w[2]*m[2] + w[3]*m[3])
		s := d.noise[i] + w[0]*s2[0] + w[1]*s2[1] + w[2]*s2[2] + w[3]*s2[3]
		if !(s > 0) {
			return math.Inf(-1)
		}
		sd := math.Sqrt(s)
		u := (d.velocity[i] - mean) / sd
		normal := math.Exp(-u*u/2) / (sd * math.Sqrt(2*math.Pi))
		if d.cut {
			low, high := (-d.limit[i]-mean)/sd, (d.limit[i]-mean)/sd
			normal /= (math.Erf(high/math.Sqrt2) - math.Erf(low/math.Sqrt2)) / 2
		}
		if d.weight != nil {
			sum += (d.weight[i] - 1) * math.Log(inside+field)
		}
		// One logarithm for several galaxies.
		product *= (inside*normal + field/(2*d.limit[i])) * scale
		if product < 1e-200 || product > 1e200 {
			sum += math.Log(product)
			product = 1
		}
	}
	sum += math.Log(product)
	if math.IsNaN(sum) {
		return math.Inf(-1)
	}
	return sum
}

// orbitsAt returns the orbits at theta; inner is r₋₂ of the mass.
func (f *jeansFit) orbitsAt(theta []float64, inner float64) (orbits, bool) {
	x := f.anisotropy.Of(theta)
	switch f.orbits {
	case "osipkov-merritt":
		return radialOutside(x), x > 0
	case "rising":
		return risingOrbits{x, inner}, x < 1
	default:
		return constantOrbits(x), x < 1
	}
}
