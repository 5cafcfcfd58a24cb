package lensing

import (
	"fmt"
	"math"
	"slices"

	"steelyard/probes/estimate"
)

// shearPart holds a halo to the tangential shear of a profile.
type shearPart struct {
	task        *estimate.Task
	halo        *massModel
	profile     *Profile // the bins that are fitted
	measure     *measure
	structureTo float64  // redshift of the sources, for structure in front of them
	variety     *variety // nil when the variety of haloes is left out
	critical    float64  // Σ_cr of a source at infinity, Msun/kpc²
	bias        estimate.Ref
	dilution    estimate.Ref
	offset      offset
}

// addShear adds the shear profile that the task's reduction made.
func (f *lensFit) addShear() error {
	p, err := f.readShear()
	if err != nil {
		return err
	}
	if p, err = within(p, f.task); err != nil {
		return f.task.Errorf("%w", err)
	}
	s, err := f.newShear(p)
	if err != nil {
		return err
	}
	f.parts = append(f.parts, s)
	return nil
}

// readShear decodes the profile that the task's reduction made.
func (f *lensFit) readShear() (*Profile, error) {
	p := new(Profile)
	if err := p.UnmarshalBinary(f.task.Reduced["profile"]); err != nil {
		return nil, f.task.Errorf("%w", err)
	}
	return p, nil
}

// newShear prepares the bins of a profile, and the assumptions that belong to
// shear.
func (f *lensFit) newShear(p *Profile) (*shearPart, error) {
	t := f.task
	terms := errorTerms(t, p)
	if !slices.Contains(terms, "shape") {
		return nil, t.Errorf("covariance: say which sources of error count, as covariance = [\"shape\"]; without `shape` there is no fit")
	}
	s := &shearPart{task: t, halo: f.halo, profile: p, critical: t.Cosmology.SigmaCritical(t.Object.Redshift, math.Inf(1))}
	var added []float64
	var err error
	if slices.Contains(terms, "structure") {
		if added, s.structureTo, err = structure(t, p.Bins); err != nil {
			return nil, t.Errorf("%w", err)
		}
	}
	s.measure = newMeasure(p, added)
	if slices.Contains(terms, "halo") {
		v := newVariety(f)
		s.variety = &v
	}
	s.bias = f.parameters.Assume(t.Settings, "shear_bias")
	s.dilution = f.parameters.Assume(t.Settings, "dilution")
	if s.offset, err = newOffset(t, &f.parameters); err != nil {
		return nil, err
	}
	return s, nil
}

// within returns the part of the profile that `fit_within` asks for.
func within(p *Profile, t *estimate.Task) (*Profile, error) {
	v := t.Settings["fit_within"]
	if !v.Set {
		return p, nil
	}
	span := v.Numbers
	if len(span) != 2 || !(span[0] < span[1]) {
		return nil, fmt.Errorf("fit_within: the second radius must lie beyond the first")
	}
	const rounding = 1e-9
	first, end := 0, len(p.Bins)
	for first < end && p.Bins[first].Inner < span[0]*(1-rounding) {
		first++
	}
	for end > first && p.Bins[end-1].Outer > span[1]*(1+rounding) {
		end--
	}
	if end-first < fewest {
		return nil, fmt.Errorf("fit_within: %d of %d bins lie wholly between %.4g and %.4g kpc; at least %d are needed", end-first, len(p.Bins), span[0], span[1], fewest)
	}
	return p.slice(first, end), nil
}

// predict fills out with the shear expected in each bin.
func (s *shearPart) predict(l lens, out []float64) {
	between := signal{
		critical: s.critical, bins: s.profile.Bins,
		elongation: l.elongation, distance: l.distance, offset: s.offset.distance.Of(l.theta),
		response: (1 + s.bias.Of(l.theta)) * (1 - s.dilution.Of(l.theta)),
	}
	between.predict(l.Model, out)
}

func (s *shearPart) likelihood() func(lens) float64 {
	compare := s.comparison()
	return func(l lens) float64 {
		ln, _ := compare(l)
		return ln + s.offset.lnDensity(l.theta)
	}
}

// comparison returns a function that gives the log likelihood and χ² of a lens.
func (s *shearPart) comparison() func(lens) (lnLikelihood, chi2 float64) {
	n := len(s.profile.Bins)
	expected, m := make([]float64, n), s.measure.copy()
	if s.variety == nil {
		return func(l lens) (float64, float64) {
			s.predict(l, expected)
			return m.compare(expected)
		}
	}
	room := [][]float64{make([]float64, n), make([]float64, n)}
	return func(l lens) (float64, float64) {
		s.predict(l, expected)
		return m.compare(expected, s.variety.modes(l, s.halo, expected, s.predict, room)...)
	}
}

func (s *shearPart) state(best lens, fit *estimate.Fit) {
	bins := s.profile.Bins
	expected := make([]float64, len(bins))
	s.predict(best, expected)
	_, chi2 := s.comparison()(best)
	fit.Chi2 += chi2
	fit.Dof += len(bins)
	cover(fit, bins[0].Inner, bins[len(bins)-1].Outer)
	checks, warnings := s.profile.checks(expected)
	fit.Checks, fit.Warnings = append(fit.Checks, checks...), append(fit.Warnings, warnings...)
	fit.Assumes = append(fit.Assumes, s.assumes()...)
}

// assumes says in words what the shear rests on.
func (s *shearPart) assumes() []string {
	lines := assumed(s.task, shearBiasSetting, dilutionSetting)
	if s.offset.rayleigh > 0 {
		lines = append(lines, fmt.Sprintf("miscentring: drawn from a Rayleigh distribution of scale %.4g kpc", s.offset.rayleigh))
	} else {
		lines = append(lines, assumed(s.task, miscentringSetting)...)
	}
	lines = append(lines, fmt.Sprintf("sources: ⟨β⟩ = %.3f of a source at infinity", meanBeta(s.profile.Bins)))
	if s.profile.Bins[0].Inner == s.profile.Bins[0].Outer {
		lines = append(lines, "shear: taken at the quoted radii, which stand for bins of no width")
	}
	return append(lines, s.terms())
}
