package reconcile

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"steelyard/probes/prior"
)

// Lever is one assumption that could be otherwise: the centre of its prior is
// moved, its width stays; an exact number is replaced by another.
type Lever struct {
	Prior     prior.Prior // as it stands
	Low, High float64     // permitted range of the centre; both zero for any
}

// Trial is a disagreement with the centre of an assumption put somewhere: its
// significance, positive as it stands, and ln ratio over half its 68% interval,
// which answers to the centre more evenly than a significance does.
type Trial struct {
	Center, Sigma, Pull float64
}

// target is the significance that a lever is to bring the disagreement to.
const target = 1

// farthest is how many standard deviations of its prior a lever is moved at
// most: beyond, it is not this assumption that is wrong.
const farthest = 10

// Center is the middle of the prior: the median, but for a half normal its mean.
func (l Lever) Center() float64 {
	if l.Prior.Kind == prior.HalfNormalKind {
		return l.Prior.Mean()
	}
	return l.Prior.Median()
}

// ratio reports whether the centre is moved by a factor rather than by an amount:
// where the prior is one in the logarithm, and for an exact number that must be
// positive.
func (l Lever) ratio() bool {
	switch l.Prior.Kind {
	case prior.LogNormalKind, prior.LogUniformKind:
		return true
	case prior.ExactKind:
		return l.Low > 0 && l.Prior.A > 0
	}
	return false
}

// coordinate is where a centre lies on the scale on which it is moved.
func (l Lever) coordinate(center float64) float64 {
	if l.ratio() {
		return math.Log(center)
	}
	return center
}

func (l Lever) center(coordinate float64) float64 {
	if l.ratio() {
		return math.Exp(coordinate)
	}
	return coordinate
}

// Width is the standard deviation of the prior on that scale; false for an exact
// number, which has none.
func (l Lever) Width() (sd float64, drawn bool) {
	p := l.Prior
	switch p.Kind {
	case prior.ExactKind:
		return 0, false
	case prior.LogNormalKind:
		return p.B, true
	case prior.LogUniformKind:
		return math.Log(p.B/p.A) / math.Sqrt(12), true
	}
	return p.SD(), true
}

// InPriorSD is how far a centre lies from the present one in standard deviations
// of the prior; false for an exact number, which has none.
func (l Lever) InPriorSD(center float64) (float64, bool) {
	w, drawn := l.Width()
	if !drawn {
		return 0, false
	}
	return (l.coordinate(center) - l.coordinate(l.Center())) / w, true
}

// Moved is the prior with its centre moved. A half normal, which has one end at
// zero, becomes a lognormal of the same standard deviation.
func (l Lever) Moved(center float64) (prior.Prior, error) {
	p := l.Prior
	switch p.Kind {
	case prior.ExactKind:
		return prior.Exact(center), nil
	case prior.NormalKind:
		return prior.Normal(center, p.B)
	case prior.LogNormalKind:
		return prior.LogNormal(center, p.B)
	case prior.UniformKind:
		half := (p.B - p.A) / 2
		return prior.Uniform(center-half, center+half)
	case prior.LogUniformKind:
		half := math.Sqrt(p.B / p.A)
		return prior.LogUniform(center/half, center*half)
	case prior.TwoPieceKind:
		return prior.TwoPiece(center, p.B, p.C)
	}
	square := math.Log1p(math.Pow(p.SD()/center, 2))
	return prior.LogNormal(center*math.Exp(-square/2), math.Sqrt(square))
}

// allows says why a centre cannot be had, "" when it can.
func (l Lever) allows(center float64) string {
	if sd, ok := l.InPriorSD(center); ok && math.Abs(sd) > farthest {
		return fmt.Sprintf("it would have to move by more than %d of its prior's standard deviations", farthest)
	}
	p, err := l.Moved(center)
	if err != nil || math.IsNaN(center) || math.IsInf(center, 0) {
		return "no value of it would do"
	}
	low, high := center, center
	if p.Kind == prior.UniformKind || p.Kind == prior.LogUniformKind {
		low, high = p.Support()
	}
	if l.Low != l.High && (low < l.Low || high > l.High) {
		return fmt.Sprintf("it would have to lie beyond its limits, %g to %g", l.Low, l.High)
	}
	return ""
}

// First is the centre to try first. needed is the change of ln ratio that would
// bring the disagreement to one sigma; slope is how ln ratio answers to the
// centre on the lever's scale, guessed from reweighted draws, 0 where the
// assumption was not drawn. Why not, when no centre would do.
//
// Reweighting draws to a prior whose centre is moved by δ changes the mean of
// ln ratio, to first order, by δ times its covariance with the assumption over
// the variance of the prior.
func (l Lever) First(needed, slope float64) (center float64, cannot string) {
	at := l.coordinate(l.Center())
	if _, drawn := l.Width(); drawn {
		center = l.center(at + needed/slope)
		return center, l.allows(center)
	}
	// An exact number says nothing of how the masses answer to it. The first trial
	// has the size that it would need if they followed it in proportion.
	step := math.Abs(needed)
	if !l.ratio() {
		step = math.Expm1(step)
		if l.High > 1000 { // a length rather than a pure number
			step *= 300
		}
	}
	for range 20 {
		for _, center := range []float64{l.center(at + step), l.center(at - step)} {
			if l.allows(center) == "" {
				return center, ""
			}
		}
		step /= 2
	}
	return 0, "it stands at its limit"
}

// Next is the centre where the disagreement should be at one sigma, by a straight
// line through the two trials nearest to that. Why not, when no centre would do.
func (l Lever) Next(trials []Trial) (center float64, cannot string) {
	near := slices.Clone(trials)
	slices.SortStableFunc(near, func(a, b Trial) int {
		return cmp.Compare(math.Abs(a.Pull-target), math.Abs(b.Pull-target))
	})
	a, b := near[0], near[1]
	// A trial is as large as would do if the masses followed in proportion; what it
	// moves by less than this is the noise of the draws.
	if math.Abs(a.Pull-b.Pull) < 0.1 {
		return 0, "it does not move these two apart or together"
	}
	x, y := l.coordinate(a.Center), l.coordinate(b.Center)
	center = l.center(x + (target-a.Pull)*(y-x)/(b.Pull-a.Pull))
	return center, l.allows(center)
}

// Reached reports whether a trial came close enough to one sigma; nearer than
// this the draws do not tell.
func (t Trial) Reached() bool { return math.Abs(t.Sigma-target) < 0.1 }

// Nearest is the trial that came closest.
func Nearest(trials []Trial) int {
	best := 0
	for i, t := range trials {
		if math.Abs(t.Sigma-target) < math.Abs(trials[best].Sigma-target) {
			best = i
		}
	}
	return best
}

// Slope is how the mean of y answers, to first order, when the centre of the
// prior of what was drawn as x moves by one of the prior's standard deviations:
// what reweighting the draws gives. scores are x in units of its prior.
func Slope(y, scores []float64) float64 { return covarianceOf(y, scores) }
