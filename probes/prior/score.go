package prior

import (
	"math"

	"gonum.org/v1/gonum/mathext"
)

// z84 is Φ⁻¹(0.84), the score of the 84th percentile.
const z84 = 0.994457883209753

// FromScore returns the value of p at unit-normal score s,
//
//	x = F⁻¹(Φ(s)),
//
// F being the distribution function of p. Each tail is computed from its own
// end of the distribution, so the distance to a limit keeps its relative
// accuracy as far as |s| = 37, where Φ leaves the range of a float64; beyond
// that the value is the limit of the support. An exact prior has its one value
// at every score.
func (p Prior) FromScore(s float64) float64 {
	switch p.Kind {
	case NormalKind:
		return p.A + p.B*s
	case HalfNormalKind:
		if s > 0 {
			return -p.A * mathext.NormalQuantile(upper(s)/2)
		}
		return p.A * math.Sqrt2 * math.Erfinv(lower(s))
	case LogNormalKind:
		return p.A * math.Exp(p.B*s)
	case UniformKind:
		// Halves before the difference: the width itself may overflow.
		if s > 0 {
			return p.B - 2*((p.B/2-p.A/2)*upper(s))
		}
		return p.A + 2*((p.B/2-p.A/2)*lower(s))
	case LogUniformKind:
		if s > 0 {
			return p.B * math.Exp(-p.lnWidth()*upper(s))
		}
		return p.A * math.Exp(p.lnWidth()*lower(s))
	case TwoPieceKind:
		if s > 0 {
			return p.A + p.C/z84*s
		}
		return p.A + p.B/z84*s
	}
	return p.A
}

// Score returns the unit-normal score of x, the inverse of FromScore:
//
//	s = Φ⁻¹(F(x)).
//
// It is −Inf at and below the lower end of the support, +Inf at and above the
// upper end, and NaN for NaN. For an exact prior it is 0 at its value and
// infinite on either side.
func (p Prior) Score(x float64) float64 {
	if math.IsNaN(x) {
		return x
	}
	lo, hi := p.Support()
	switch {
	case p.Kind == ExactKind && x == p.A:
		return 0
	case x <= lo:
		return math.Inf(-1)
	case x >= hi:
		return math.Inf(1)
	}
	switch p.Kind {
	case NormalKind:
		return (x - p.A) / p.B
	case HalfNormalKind:
		return fromTails(math.Erf(x/p.A/math.Sqrt2), math.Erfc(x/p.A/math.Sqrt2))
	case LogNormalKind:
		return (math.Log(x) - math.Log(p.A)) / p.B
	case UniformKind:
		half := p.B/2 - p.A/2
		return fromTails((x/2-p.A/2)/half, (p.B/2-x/2)/half)
	case LogUniformKind:
		return fromTails(lnRatio(p.A, x)/p.lnWidth(), lnRatio(x, p.B)/p.lnWidth())
	default: // TwoPieceKind
		if x > p.A {
			return (x - p.A) / (p.C / z84)
		}
		return (x - p.A) / (p.B / z84)
	}
}

// Support returns the ends of the range of possible values.
func (p Prior) Support() (lo, hi float64) {
	switch p.Kind {
	case HalfNormalKind, LogNormalKind:
		return 0, math.Inf(1)
	case UniformKind, LogUniformKind:
		return p.A, p.B
	case ExactKind:
		return p.A, p.A
	}
	return math.Inf(-1), math.Inf(1)
}

// lower returns Φ(s) and upper 1 − Φ(s), neither by subtraction.
func lower(s float64) float64 { return math.Erfc(-s/math.Sqrt2) / 2 }
func upper(s float64) float64 { return math.Erfc(s/math.Sqrt2) / 2 }

// fromTails returns the score with probability below and above it, from the
// smaller of the two, which is the accurate one.
func fromTails(below, above float64) float64 {
	if below < above {
		return mathext.NormalQuantile(below)
	}
	return -mathext.NormalQuantile(above)
}

// lnWidth is ln(B/A).
func (p Prior) lnWidth() float64 { return lnRatio(p.A, p.B) }

// lnRatio is ln(b/a) for 0 < a ≤ b, without cancellation where they are close
// and safe where the ratio overflows.
func lnRatio(a, b float64) float64 {
	if b < 2*a {
		return math.Log1p((b - a) / a)
	}
	return math.Log(b) - math.Log(a)
}
