package prior

import (
	"fmt"
	"math"
	"strconv"
)

// CDF returns the probability of a value below x. For an exact prior it is 0
// below the value, ½ at it and 1 above it.
func (p Prior) CDF(x float64) float64 { return lower(p.Score(x)) }

// Quantile returns the value below which a fraction q of the probability lies:
// the ends of the support at 0 and 1, NaN outside them.
func (p Prior) Quantile(q float64) float64 {
	lo, hi := p.Support()
	switch {
	case math.IsNaN(q) || q < 0 || q > 1:
		return math.NaN()
	case q == 0:
		return lo
	case q == 1:
		return hi
	}
	return p.FromScore(fromTails(q, 1-q))
}

// Median returns the 50th percentile.
func (p Prior) Median() float64 { return p.FromScore(0) }

// LogDensity returns the natural logarithm of the probability density at x,
// per unit of x: −Inf outside the support. An exact prior has no density: it
// is +Inf at the value and −Inf elsewhere. A two-piece normal has a step at its
// median, where the density of the lower side is returned.
func (p Prior) LogDensity(x float64) float64 {
	lo, hi := p.Support()
	if x < lo || x > hi {
		return math.Inf(-1)
	}
	switch p.Kind {
	case NormalKind:
		return lnNormal(x-p.A, p.B)
	case HalfNormalKind:
		return math.Ln2 + lnNormal(x, p.A)
	case LogNormalKind:
		if x == 0 {
			return math.Inf(-1)
		}
		return lnNormal(math.Log(x)-math.Log(p.A), p.B) - math.Log(x)
	case UniformKind:
		return -math.Ln2 - math.Log(p.B/2-p.A/2)
	case LogUniformKind:
		return -math.Log(p.lnWidth()) - math.Log(x)
	case TwoPieceKind:
		if x > p.A {
			return lnNormal(x-p.A, p.C/z84)
		}
		return lnNormal(x-p.A, p.B/z84)
	}
	return math.Inf(1)
}

func lnNormal(d, sd float64) float64 {
	d /= sd
	return -d*d/2 - math.Log(sd) - math.Log(2*math.Pi)/2
}

// Mean returns the expectation.
func (p Prior) Mean() float64 {
	switch p.Kind {
	case HalfNormalKind:
		return p.A * math.Sqrt(2/math.Pi)
	case LogNormalKind:
		return p.A * math.Exp(p.B*p.B/2)
	case UniformKind:
		return p.A/2 + p.B/2
	case LogUniformKind:
		h := p.lnWidth() / 2
		return math.Sqrt(p.A) * math.Sqrt(p.B) * sinhc(h)
	case TwoPieceKind:
		return p.A + (p.C-p.B)/z84/math.Sqrt(2*math.Pi)
	}
	return p.A
}

// SD returns the standard deviation, 0 for an exact prior.
func (p Prior) SD() float64 {
	switch p.Kind {
	case NormalKind:
		return p.B
	case HalfNormalKind:
		return p.A * math.Sqrt(1-2/math.Pi)
	case LogNormalKind:
		return p.Mean() * math.Sqrt(math.Expm1(p.B*p.B))
	case UniformKind:
		return (p.B/2 - p.A/2) / math.Sqrt(3)
	case LogUniformKind:
		// With g = √(AB) and h = ln(B/A)/2: E[x] = g·sinh(h)/h and
		// E[x²] = g²·sinh(2h)/2h.
		h := p.lnWidth() / 2
		spread := math.Cosh(h) - sinhc(h)
		if h < 0.1 { // the difference cancels; its series does not
			h2 := h * h
			spread = h2 / 3 * (1 + h2/10*(1+h2/28*(1+h2/54)))
		}
		return math.Sqrt(p.A) * math.Sqrt(p.B) * math.Sqrt(sinhc(h)*spread)
	case TwoPieceKind:
		lo, hi, shift := p.B/z84, p.C/z84, p.Mean()-p.A
		return math.Sqrt((lo*lo+hi*hi)/2 - shift*shift)
	}
	return 0
}

// sinhc is sinh(h)/h for h > 0.
func sinhc(h float64) float64 { return math.Sinh(h) / h }

// String writes p as a recipe does: 0.3, normal(1, 0.04), half_normal(0.1),
// lognormal(4.5, 0.3), uniform(-0.5, 0.5), loguniform(1e+12, 1e+16), or
// 6.1 +0.9 -0.8 for a two-piece normal.
func (p Prior) String() string {
	a, b, c := number(p.A), number(p.B), number(p.C)
	switch p.Kind {
	case NormalKind:
		return fmt.Sprintf("normal(%s, %s)", a, b)
	case HalfNormalKind:
		return fmt.Sprintf("half_normal(%s)", a)
	case LogNormalKind:
		return fmt.Sprintf("lognormal(%s, %s)", a, b)
	case UniformKind:
		return fmt.Sprintf("uniform(%s, %s)", a, b)
	case LogUniformKind:
		return fmt.Sprintf("loguniform(%s, %s)", a, b)
	case TwoPieceKind:
		return fmt.Sprintf("%s +%s -%s", a, c, b)
	}
	return a
}

func number(x float64) string { return strconv.FormatFloat(x, 'g', -1, 64) }
