package lensing

import (
	"context"
	"fmt"
	"math"

	"steelyard/probes/estimate"
	"steelyard/probes/infer"
)

// shearFit is one halo and one profile.
type shearFit struct {
	task       *estimate.Task
	profile    *Profile // the bins that are fitted
	measure    *measure
	critical   float64 // Σ_cr of a source at infinity, Msun/kpc²
	parameters estimate.Parameters
	halo       *massModel
	bias       estimate.Ref
	dilution   estimate.Ref
	distance   estimate.Ref
	elongation estimate.Ref
	offset     offset
}

func newShearFit(t *estimate.Task, p *Profile) (*shearFit, error) {
	f := &shearFit{task: t, critical: t.Cosmology.SigmaCritical(t.Object.Redshift, math.Inf(1))}
	if terms := t.Settings["covariance"].List; len(terms) != 1 || terms[0] != "shape" {
		return nil, t.Errorf("say `covariance = [\"shape\"]`: no other source of error is built yet")
	}
	var err error
	if f.profile, err = within(p, t); err != nil {
		return nil, t.Errorf("%w", err)
	}
	if f.measure, err = newMeasure(f.profile); err != nil {
		return nil, t.Errorf("%w", err)
	}
	ps := &f.parameters
	if f.halo, err = newMassModel(t, ps); err != nil {
		return nil, err
	}
	f.bias = ps.Assume(t.Settings, "shear_bias")
	f.dilution = ps.Assume(t.Settings, "dilution")
	f.distance = ps.Assume(t.Settings, "source_distance_scale")
	f.elongation = ps.Assume(t.Settings, "elongation")
	if f.offset, err = newOffset(t, ps); err != nil {
		return nil, err
	}
	if len(ps.Free) == 0 {
		return nil, t.Errorf("every parameter is an exact number, so there is nothing to fit")
	}
	return f, nil
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

// predict fills out with the shear expected in each bin at theta, and reports
// whether there is a model.
func (f *shearFit) predict(theta, out []float64) bool {
	m, ok := f.halo.at(theta)
	if !ok {
		return false
	}
	s := signal{
		critical: f.critical, bins: f.profile.Bins,
		elongation: f.elongation.Of(theta), distance: f.distance.Of(theta), offset: f.offset.distance.Of(theta),
		response: (1 + f.bias.Of(theta)) * (1 - f.dilution.Of(theta)),
	}
	s.predict(m, out)
	return true
}

func (f *shearFit) run(ctx context.Context) (*infer.Draws, error) {
	problem := infer.Problem{
		Free: f.parameters.Free,
		Likelihood: func() func([]float64) float64 {
			expected := make([]float64, len(f.profile.Bins))
			return func(theta []float64) float64 {
				if !f.predict(theta, expected) {
					return math.Inf(-1)
				}
				return f.measure.logNorm - f.measure.chi2(expected)/2 + f.offset.lnDensity(theta)
			}
		},
	}
	sample, err := infer.DrawPosterior(ctx, problem, f.task.Sampling)
	if err != nil {
		return nil, f.task.Errorf("%w", err)
	}
	best := make([]float64, len(f.profile.Bins))
	if !f.predict(sample.Best, best) {
		return nil, f.task.Errorf("the best fit has no halo")
	}
	checks, warnings := f.profile.checks(best)
	return f.task.Finish(estimate.Fit{
		Sample: sample, Parameters: &f.parameters, LnMass: f.halo.lnMass, Derived: f.halo.derived(),
		Covers: [2]float64{f.profile.Bins[0].Inner, f.profile.Bins[len(f.profile.Bins)-1].Outer},
		Chi2:   f.measure.chi2(best), Dof: max(len(f.profile.Bins)-f.halo.drawn, 0),
		Assumes: f.assumes(), Checks: checks, Warnings: warnings,
	})
}

// assumes says in words what the masses rest on beside the prior on the mass.
func (f *shearFit) assumes() []string {
	t := f.task
	lines := append(f.halo.assumes(t), assumed(t, shearBiasSetting, dilutionSetting, distanceScaleSetting, elongationSetting)...)
	if f.offset.rayleigh > 0 {
		lines = append(lines, fmt.Sprintf("miscentring: drawn from a Rayleigh distribution of scale %.4g kpc", f.offset.rayleigh))
	} else {
		lines = append(lines, assumed(t, miscentringSetting)...)
	}
	beta, weight := 0.0, 0.0
	for _, b := range f.profile.Bins {
		w := 1 / (b.Error() * b.Error())
		beta, weight = beta+w*b.Beta, weight+w
	}
	lines = append(lines, fmt.Sprintf("sources: ⟨β⟩ = %.3f of a source at infinity", beta/weight))
	if f.profile.Bins[0].Inner == f.profile.Bins[0].Outer {
		lines = append(lines, "shear: taken at the quoted radii, which stand for bins of no width")
	}
	if f.profile.Covariance != nil {
		return append(lines, "errors: the covariance given with the profile")
	}
	return append(lines, "errors: shape noise alone; structure along the line of sight and the variety of haloes are left out")
}
