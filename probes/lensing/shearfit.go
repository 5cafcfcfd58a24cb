package lensing

import (
	"context"
	"fmt"
	"math"

	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/infer"
	"steelyard/probes/method"
)

// shearFit is one halo and one profile.
type shearFit struct {
	task       *estimate.Task
	profile    *Profile // the bins that are fitted
	measure    *measure
	threshold  float64 // mean density inside r_200c, Msun/kpc³
	critical   float64 // Σ_cr of a source at infinity, Msun/kpc²
	isothermal bool

	parameters    estimate.Parameters
	mass          estimate.Ref
	concentration estimate.Concentration
	shaped        bool // whether the concentration is drawn
	bias          estimate.Ref
	dilution      estimate.Ref
	distance      estimate.Ref
	elongation    estimate.Ref
}

func newShearFit(t *estimate.Task, p *Profile) (*shearFit, error) {
	f := &shearFit{task: t, isothermal: t.Settings["halo"].Text == "isothermal"}
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
	if f.threshold, err = (halo.Definition{Delta: 200, Of: "critical"}).Threshold(t.Cosmology, t.Object.Redshift); err != nil {
		return nil, t.Errorf("%w", err)
	}
	f.critical = t.Cosmology.SigmaCritical(t.Object.Redshift, math.Inf(1))
	ps := &f.parameters
	f.mass = ps.Assume(method.Settings{"mass_200c": t.Settings["mass"]}, "mass_200c")
	if !f.isothermal {
		before := len(ps.Free)
		if f.concentration, err = ps.Concentration(t); err != nil {
			return nil, err
		}
		f.shaped = len(ps.Free) > before
	}
	f.bias = ps.Assume(t.Settings, "shear_bias")
	f.dilution = ps.Assume(t.Settings, "dilution")
	f.distance = ps.Assume(t.Settings, "source_distance_scale")
	f.elongation = ps.Assume(t.Settings, "elongation")
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

// model is the halo at theta; not ok where there is none.
func (f *shearFit) model(theta []float64) (m halo.Model, ok bool) {
	mass := f.mass.Of(theta)
	if !(mass > 0) {
		return nil, false
	}
	if f.isothermal {
		return halo.NewIsothermal(mass, f.threshold), true
	}
	c := f.concentration.Of(theta, mass)
	if !(c > 0) {
		return nil, false
	}
	return halo.NewNFW(mass, c, f.threshold), true
}

// predict fills out with the shear expected in each bin at theta, and reports
// whether there is a model.
func (f *shearFit) predict(theta, out []float64) bool {
	m, ok := f.model(theta)
	if !ok {
		return false
	}
	signal{
		critical: f.critical, bins: f.profile.Bins,
		elongation: f.elongation.Of(theta), distance: f.distance.Of(theta),
		response: (1 + f.bias.Of(theta)) * (1 - f.dilution.Of(theta)),
	}.predict(m, out)
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
				return f.measure.logNorm - f.measure.chi2(expected)/2
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
	dof := len(f.profile.Bins)
	if f.mass.Drawn() {
		dof--
	}
	fit := estimate.Fit{
		Sample: sample, Parameters: &f.parameters,
		LnMass: func(theta, radii, out []float64) error {
			m, _ := f.model(theta)
			for i, r := range radii {
				out[i] = math.Log(m.Mass(r))
			}
			return nil
		},
		Covers: [2]float64{f.profile.Bins[0].Inner, f.profile.Bins[len(f.profile.Bins)-1].Outer},
		Chi2:   f.measure.chi2(best), Assumes: f.assumes(), Checks: checks, Warnings: warnings,
	}
	switch {
	case f.isothermal:
		fit.Derived = append(fit.Derived, estimate.Derived{Name: "dispersion", Unit: "km/s", Of: func(theta []float64) float64 {
			return halo.NewIsothermal(f.mass.Of(theta), f.threshold).Sigma
		}})
	case f.concentration.Related():
		fit.Derived = append(fit.Derived, estimate.Derived{Name: "concentration", Of: func(theta []float64) float64 {
			return f.concentration.Of(theta, f.mass.Of(theta))
		}})
	}
	if f.shaped {
		dof--
	}
	fit.Dof = max(dof, 0)
	return f.task.Finish(fit)
}

// assumes says in words what the masses rest on beside the prior on the mass.
func (f *shearFit) assumes() []string {
	t := f.task
	lines := []string{"halo: NFW, with an infinite line of sight"}
	shared := []method.Setting{shearBiasSetting, dilutionSetting, distanceScaleSetting, elongationSetting}
	if f.isothermal {
		lines[0] = "halo: singular isothermal sphere, with an infinite line of sight"
	} else {
		shared = append([]method.Setting{concentrationSetting}, shared...)
	}
	lines = append(lines, assumed(t, shared...)...)
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
