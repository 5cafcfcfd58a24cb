package xray

import (
	"errors"
	"math"

	"steelyard/probes/estimate"
	"steelyard/probes/prior"
)

// temperature is the three-dimensional temperature of Vikhlinin et al. 2006,
// eq. 6,
//
//	kT(r) = T0 · (x + Tmin)/(x + 1) · (r/rt)^(−a) / (1 + (r/rt)^b)^(c/b),   x = (r/rcool)^acool,
//
// Tmin being a ratio to T0; without a cool core Tmin = 1. T0 in keV, radii in
// kpc.
type temperature struct{ T0, rt, a, b, c, Tmin, rcool, acool float64 }

// kT returns the temperature in keV at the radius whose logarithm is ln.
func (t *temperature) kT(ln float64) float64 {
	u := ln - math.Log(t.rt)
	kT := math.Log(t.T0) - t.a*u - t.c/t.b*math.Log(1+math.Exp(t.b*u))
	if t.Tmin == 1 {
		return math.Exp(kT)
	}
	x := math.Exp(t.acool * (ln - math.Log(t.rcool)))
	return math.Exp(kT) * (x + t.Tmin) / (x + 1)
}

// slope returns d ln T / d ln r there.
func (t *temperature) slope(ln float64) float64 {
	y := math.Exp(t.b * (ln - math.Log(t.rt)))
	s := -t.a - t.c*y/(1+y)
	if t.Tmin != 1 {
		x := math.Exp(t.acool * (ln - math.Log(t.rcool)))
		s += t.acool * x * (1/(x+t.Tmin) - 1/(x+1))
	}
	return s
}

// The versions of the form: isothermal has one parameter, short three,
// cool-core five and full seven.
const (
	isothermal   = "isothermal"
	shortForm    = "short"
	coolCoreForm = "cool-core"
	fullForm     = "full"
)

// versionFor is the version that a number of bins can bear: twice as many bins
// as parameters, or nearly.
func versionFor(bins int) string {
	switch {
	case bins < 6:
		return shortForm
	case bins < 12:
		return coolCoreForm
	}
	return fullForm
}

// temperatureFit is the form with the parameters that are fitted.
type temperatureFit struct {
	words string
	base  temperature
	refs  []estimate.Ref
	place []func(*temperature) *float64
}

// newTemperatureFit adds the parameters of a version, with wide priors about
// what the bins suggest (common practice, no source).
func newTemperatureFit(p *estimate.Parameters, version string, s *Spectra) (*temperatureFit, error) {
	last := s.Outer[s.Len()-1]
	f := &temperatureFit{words: "one kT = T0 at all radii", base: temperature{rt: 1, b: 2, Tmin: 1, rcool: 1, acool: 1}}
	var faults []error
	add := func(name, unit string, place func(*temperature) *float64, pr prior.Prior, err error) {
		faults = append(faults, err)
		f.refs = append(f.refs, p.Draw(name, unit, pr))
		f.place = append(f.place, place)
	}
	lognormal := func(name, unit string, place func(*temperature) *float64, median, sd float64) {
		pr, err := prior.LogNormal(median, sd)
		add(name, unit, place, pr, err)
	}
	pr, err := prior.LogUniform(leastTemperature, 2*mostTemperature)
	add("T0", "keV", func(t *temperature) *float64 { return &t.T0 }, pr, err)
	if version == isothermal {
		return f, errors.Join(faults...)
	}
	f.words = "kT = T0 (1 + (r/rt)²)^(-c/2), a short form without a cool core"
	lognormal("rt", "kpc", func(t *temperature) *float64 { return &t.rt }, 0.5*last, 1)
	lognormal("c", "", func(t *temperature) *float64 { return &t.c }, 0.9, 0.6)
	if version != shortForm {
		f.words, f.base.acool = "eq. 6 of Vikhlinin et al. 2006 with a = 0, b = 2, acool = 1.9", 1.9
		pr, err := prior.Uniform(0, 1)
		add("Tmin", "", func(t *temperature) *float64 { return &t.Tmin }, pr, err)
		lognormal("rcool", "kpc", func(t *temperature) *float64 { return &t.rcool }, 0.06*last, 1)
	}
	if version == fullForm {
		f.words = "eq. 6 of Vikhlinin et al. 2006 with a = 0"
		lognormal("b", "", func(t *temperature) *float64 { return &t.b }, 2, 0.3)
		lognormal("acool", "", func(t *temperature) *float64 { return &t.acool }, 1.9, 0.3)
	}
	return f, errors.Join(faults...)
}

// at returns the temperature at theta.
func (f *temperatureFit) at(theta []float64) temperature {
	t := f.base
	for i, ref := range f.refs {
		*f.place[i](&t) = ref.Of(theta)
	}
	return t
}
