package reconcile

import (
	"math"
	"sort"

	"gonum.org/v1/gonum/mathext"
)

const (
	// tailFrom is how many standard deviations out, counted in probability, a
	// density is taken from its smoothed tail.
	tailFrom = 2
	// tailFit is where the part begins to which the tail is fitted.
	tailFit = 0.7
	// trusted is the relative Monte Carlo error of a probability up to which the
	// draws themselves tell it: 0.5 in p is 0.12σ at 4σ.
	trusted = 0.5
	// tailPoints is how many points the fit takes.
	tailPoints = 16
	// tailBend is the prior error of the bend, in standard deviations per squared
	// standard deviation; a skewness γ bends the tails by γ/6.
	tailBend = 0.02
)

// tail is the outer part of a density. At a distance u beyond x it is as far out
// as a unit normal at
//
//	z(u) = start + rise·u + bend·u²   up to u = resolved, where the draws end,
//
// and from there on straight. A normal density has a straight z.
type tail struct {
	x                 float64
	start, rise, bend float64
	resolved          float64
}

// at returns z and its slope at a distance u beyond the tail's start.
func (t tail) at(u float64) (z, slope float64) {
	v := min(u, t.resolved)
	slope = t.rise + 2*t.bend*v
	return t.start + t.rise*v + t.bend*v*v + slope*(u-v), slope
}

// logDensity is the logarithm of the density at a distance u beyond the start.
func (t tail) logDensity(u float64) float64 {
	z, slope := t.at(u)
	return -z*z/2 + math.Log(slope) - math.Log(2*math.Pi)/2
}

// invert is the distance at which a tail is as far out as a unit normal at z.
func (t tail) invert(z float64) float64 {
	if z <= t.start {
		return 0
	}
	if root := t.rise*t.rise + 4*t.bend*(z-t.start); root > 0 {
		if u := 2 * (z - t.start) / (t.rise + math.Sqrt(root)); u <= t.resolved {
			return u
		}
	}
	edge, slope := t.at(t.resolved)
	return t.resolved + (z-edge)/slope
}

// lessLikely is the probability of the part of the tail whose density is below
// exp(level). The density is taken to fall outwards.
func (t tail) lessLikely(level float64) float64 {
	// ln density = −z²/2 + ln(slope/√2π), whose slope changes slowly with z: each
	// round shrinks the error by the square of bend·/slope, below 0.01.
	u, z := 0.0, t.start
	for range 6 {
		_, slope := t.at(u)
		square := 2 * (math.Log(slope) - math.Log(2*math.Pi)/2 - level)
		if !(square > t.start*t.start) {
			return normalBelow(-t.start)
		}
		z = math.Sqrt(square)
		u = t.invert(z)
	}
	return normalBelow(-z)
}

// confidence is how well draws know the probability of a tail.
type confidence struct {
	last   float64             // standard deviations out, up to which they tell it
	weight [tailPoints]float64 // of the points of the fit in z
	z      [tailPoints]float64
}

// newConfidence is for the sum of n draws of each of several parts whose
// variances are the given shares of the whole.
func newConfidence(shares []float64, n int) *confidence {
	c := &confidence{last: resolvedTo(shares, n)}
	for k := range tailPoints {
		z := tailFit + (c.last-tailFit)*float64(k)/(tailPoints-1)
		// dz = dp/φ(z): the relative error of p times the Mills ratio.
		sd := relativeError(z, shares, n) * normalBelow(-z) * math.Sqrt(2*math.Pi) * math.Exp(z*z/2)
		c.z[k], c.weight[k] = z, 1/(sd*sd)
	}
	return c
}

// lowerTail fits the lower tail of a density: z of the cumulative probability
// against the value, by a parabola from tailFit to the last value the draws
// resolve. A prior holds the bend near that of a normal density, so that the
// last few draws do not decide it.
func (c *confidence) lowerTail(cumulative grid) tail {
	at := func(z float64) int {
		return min(sort.SearchFloat64s(cumulative.values, normalBelow(-z)), len(cumulative.values)-1)
	}
	start, inner := at(tailFrom), at(tailFit)
	sigma := (cumulative.x(inner) - cumulative.x(start)) / (tailFrom - tailFit)
	fit := parabola{s4: 1 / (tailBend * tailBend)}
	for k, z := range c.z {
		i := at(z)
		fit.add((cumulative.x(start)-cumulative.x(i))/sigma, -mathext.NormalQuantile(cumulative.values[i]), c.weight[k])
	}
	t := tail{x: cumulative.x(start), resolved: cumulative.x(start) - cumulative.x(at(c.last))}
	a, b, bend := fit.solve()
	// A tail must go on falling: a parabola that would turn is not one.
	if u := t.resolved / sigma; !(b+2*bend*u > 0.1*b) {
		a, b, bend = fit.line()
	}
	t.start, t.rise, t.bend = a, b/sigma, bend/(sigma*sigma)
	return t
}

// resolvedTo is how many standard deviations out the draws tell probabilities
// with a relative error below trusted.
func resolvedTo(shares []float64, n int) float64 {
	lo, hi := tailFrom+0.5, 8.0
	for range 14 { // to 3e-4
		if mid := (lo + hi) / 2; relativeError(mid, shares, n) < trusted {
			lo = mid
		} else {
			hi = mid
		}
	}
	return lo
}

// relativeError is the Monte Carlo error, in units of itself, of the probability
// that a sum lies more than z standard deviations below its mean, when every
// combination of n draws of each part counts. Its square is the sum over parts of
//
//	(P(both of two sums that share the draw of that part lie there)/Φ(−z)² − 1)/n ,
//
// and for normal parts with shares ρ of the variance P − Φ(−z)² is the integral of
// exp(−z²/(1 + sin θ))/2π from 0 to arcsin ρ (Drezner & Wesolowsky 1990). The law
// of normal parts stands in for that of the parts themselves: what few draws lie
// far out should not be asked how far they can be trusted.
func relativeError(z float64, shares []float64, n int) float64 {
	const intervals = 16 // of Simpson's rule: to 1% at z = 8
	sum := 0.0
	for _, rho := range shares {
		step := math.Asin(min(rho, 1)) / intervals
		for i := range intervals + 1 {
			weight := step / 3
			switch {
			case i%2 == 1:
				weight *= 4
			case i > 0 && i < intervals:
				weight *= 2
			}
			sum += weight * math.Exp(-z*z/(1+math.Sin(float64(i)*step)))
		}
	}
	p := normalBelow(-z)
	return math.Sqrt(sum/(2*math.Pi)/float64(n)) / p
}

// parabola accumulates a weighted least-squares fit of y = a + b x + c x².
type parabola struct {
	s0, s1, s2, s3, s4, y0, y1, y2 float64
}

func (p *parabola) add(x, y, w float64) {
	p.s0 += w
	p.s1 += w * x
	p.s2 += w * x * x
	p.s3 += w * x * x * x
	p.s4 += w * x * x * x * x
	p.y0 += w * y
	p.y1 += w * x * y
	p.y2 += w * x * x * y
}

// solve solves the normal equations by Cramer's rule.
func (p *parabola) solve() (a, b, c float64) {
	det := determinant(p.s0, p.s1, p.s2, p.s1, p.s2, p.s3, p.s2, p.s3, p.s4)
	a = determinant(p.y0, p.s1, p.s2, p.y1, p.s2, p.s3, p.y2, p.s3, p.s4) / det
	b = determinant(p.s0, p.y0, p.s2, p.s1, p.y1, p.s3, p.s2, p.y2, p.s4) / det
	c = determinant(p.s0, p.s1, p.y0, p.s1, p.s2, p.y1, p.s2, p.s3, p.y2) / det
	return a, b, c
}

// line is the fit without the square.
func (p *parabola) line() (a, b, c float64) {
	det := p.s0*p.s2 - p.s1*p.s1
	return (p.y0*p.s2 - p.y1*p.s1) / det, (p.s0*p.y1 - p.s1*p.y0) / det, 0
}

func determinant(a, b, c, d, e, f, g, h, i float64) float64 {
	return a*(e*i-f*h) - b*(d*i-f*g) + c*(d*h-e*g)
}
