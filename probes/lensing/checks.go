package lensing

import (
	"fmt"
	"math"

	"steelyard/probes/infer"
)

// strong is the reduced shear above which the mean over sources to second order
// is no longer good to a per cent or two (common practice, no source).
const strong = 0.3 // as the name of the check says

// sparse is the number of sources below which the mean of a bin is not yet
// normally distributed (common practice, no source).
const sparse = 10

// template is the mean of 1/R over the bin: the shear of an isothermal sphere
// but for a factor.
func (b Bin) template() float64 {
	sum := 0.0
	for _, n := range b.Nodes {
		sum += n.Share / n.Radius
	}
	return sum
}

// slice returns the bins first ≤ i < end with their covariance.
func (p *Profile) slice(first, end int) *Profile {
	part := *p
	part.Bins = p.Bins[first:end]
	if p.Covariance != nil {
		n := len(p.Bins)
		part.Covariance = nil
		for i := first; i < end; i++ {
			part.Covariance = append(part.Covariance, p.Covariance[i*n+first:i*n+end]...)
		}
	}
	return &part
}

// signalToNoise is that of the amplitude of a 1/R profile fitted to the shear,
//
//	S = Σ t g/σ² / (Σ t²/σ²)^½,   t = ⟨1/R⟩,
//
// signed: about 0 ± 1 without a signal. first is the share of the first bin in
// Σ t²/σ², the weight with which it enters.
//
// flipped is S with the sign of e2 reversed.
func (p *Profile) signalToNoise() (s, flipped, first float64) {
	sum, other, norm := 0.0, 0.0, 0.0
	for i, b := range p.Bins {
		t, sigma := b.template(), b.Error()
		sum += t * b.Shear / (sigma * sigma)
		other += t * b.Flipped / (sigma * sigma)
		norm += t * t / (sigma * sigma)
		if i == 0 {
			first = norm
		}
	}
	return sum / math.Sqrt(norm), other / math.Sqrt(norm), first / norm
}

// checks states what the profile and the best fit say of themselves; expected
// is the shear of the best fit in each bin.
func (p *Profile) checks(expected []float64) (checks []infer.Check, warnings []string) {
	warnings = append(warnings, p.Warnings...)
	add := func(c infer.Check, warning string) {
		if !c.Passed { // the warning stands for the note, which is then not said twice
			c.Note = ""
			warnings = append(warnings, warning)
		}
		checks = append(checks, c)
	}
	if p.HasCross {
		add(p.crossCheck(), "the cross shear is not zero: gravity makes none, so the shapes or the centre are at fault")
	}
	s, flipped, first := p.signalToNoise()
	add(infer.Check{
		Name: "tangential signal-to-noise", Statistic: s, PValue: -1, Passed: s > 2,
		Note: "of a 1/R profile",
	}, fmt.Sprintf("no tangential shear to speak of: signal-to-noise %.1f", s))
	if p.Counted {
		c, warning := handedness(s, flipped)
		add(c, warning)
	}
	add(infer.Check{
		Name: "share of weight in the first bin", Statistic: first, PValue: -1, Passed: first < 0.5,
		Note: "in that signal-to-noise squared",
	}, fmt.Sprintf("the first bin alone carries %.0f%% of the weight", 100*first))
	if p.Counted {
		fewest := p.Bins[0]
		for _, b := range p.Bins {
			if b.Sources < fewest.Sources {
				fewest = b
			}
		}
		add(infer.Check{
			Name: "fewest sources in a bin", Statistic: float64(fewest.Sources), PValue: -1, Passed: fewest.Sources >= sparse,
		}, fmt.Sprintf("only %d sources between %.4g and %.4g kpc: their mean is hardly normal", fewest.Sources, fewest.Inner, fewest.Outer))
	}
	if p.Counted {
		add(p.turnedCheck())
	}
	beyond := 0
	for _, g := range expected {
		if math.Abs(g) > strong {
			beyond++
		}
	}
	checks = append(checks, infer.Check{
		Name: "bins with g above 0.3", Statistic: float64(beyond), PValue: -1, Passed: true, Note: "of the best fit",
	})
	if beyond > 0 {
		warnings = append(warnings, fmt.Sprintf("the best fit has a reduced shear above %g in %d of %d bins: there the mean over the sources' redshifts errs by several per cent; the bins were kept, and fit_within leaves them out", strong, beyond, len(expected)))
	}
	return checks, warnings
}

// crossCheck is χ² of the cross shear against zero. Its errors are those of the
// tangential shear.
func (p *Profile) crossCheck() infer.Check {
	n := len(p.Bins)
	chi2 := 0.0
	for _, b := range p.Bins {
		d := b.Cross / b.Error()
		chi2 += d * d
	}
	pv := infer.ChiSquareP(chi2, n)
	return infer.Check{
		Name: "cross shear", Statistic: chi2, PValue: pv, Passed: pv >= 0.01,
		Note: fmt.Sprintf("χ² against zero, %d bins", n),
	}
}

// handedness asks whether another sign of e1 or e2 would give a far better
// signal than s: a mirrored catalogue passes the cross-shear check, since its
// tangential and cross shear both average to zero.
func handedness(s, flipped float64) (infer.Check, string) {
	// Reversing both reverses the signal; reversing e1 reverses that of e2 reversed.
	best, what := flipped, "the sign of e2 reversed; set `handedness`"
	if -flipped > best {
		best, what = -flipped, "the sign of e1 reversed; the angle of the shapes is perhaps counted from north"
	}
	if -s > best {
		best, what = -s, "the signs of e1 and e2 reversed; the shapes are perhaps drawn out towards the centre"
	}
	c := infer.Check{
		Name: "best signal with a sign reversed", Statistic: best, PValue: -1, Passed: !(best > 3 && best-s > 3),
		Note: "the tangential signal-to-noise if e1, e2 or both had the other sign",
	}
	return c, fmt.Sprintf("the tangential signal-to-noise is %.1f, but %.1f with %s", s, best, what)
}

// turnedCheck compares the errors with those that turning every shape at random
// would give. The two differ where one bin's shapes scatter unlike the others';
// σ² of n sources is itself known to 1/n of it, or to a few times that when
// weights differ.
func (p *Profile) turnedCheck() (infer.Check, string) {
	worst, at, passed := 1.0, p.Bins[0], true
	for _, b := range p.Bins {
		r := b.Turned / b.Error()
		if math.Abs(math.Log(r)) > math.Abs(math.Log(worst)) {
			worst, at = r, b
		}
		if math.Abs(r-1) > 0.1+4/math.Sqrt(float64(b.Sources)) {
			passed = false
		}
	}
	return infer.Check{
		Name: "error by turned shapes over error", Statistic: worst, PValue: -1, Passed: passed, Note: "in the bin where they differ most",
	}, fmt.Sprintf("between %.4g and %.4g kpc turning every shape at random gives %.2f times the error: the shapes there scatter unlike those of the other bins", at.Inner, at.Outer, worst)
}
