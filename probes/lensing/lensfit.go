package lensing

import (
	"context"
	"math"

	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/infer"
	"steelyard/probes/method"
)

// lensFit is one halo held to one or more kinds of data.
type lensFit struct {
	task       *estimate.Task
	parameters estimate.Parameters
	halo       *massModel
	elongation estimate.Ref
	distance   estimate.Ref
	parts      []part
	images     *imagesPart // the one of parts that needs a search; nil for none
}

// lens is what bends the light, at one point of parameter space.
type lens struct {
	halo.Model
	theta      []float64
	elongation float64 // multiplies the projected mass
	distance   float64 // multiplies β of every source
}

// part is one kind of data.
type part interface {
	// likelihood returns a function with scratch space of its own.
	likelihood() func(lens) float64
	// state adds what there is to say of the best fit.
	state(best lens, fit *estimate.Fit)
}

// newLensFit starts a fit with the halo and the assumptions that all data
// share.
func newLensFit(t *estimate.Task) (*lensFit, error) {
	f := &lensFit{task: t}
	var err error
	if f.halo, err = newMassModel(t, &f.parameters); err != nil {
		return nil, err
	}
	f.distance = f.parameters.Assume(t.Settings, "source_distance_scale")
	f.elongation = f.parameters.Assume(t.Settings, "elongation")
	return f, nil
}

// at is the lens at theta; not ok where there is none.
func (f *lensFit) at(theta []float64) (lens, bool) {
	h, ok := f.halo.at(theta)
	l := lens{h, theta, f.elongation.Of(theta), f.distance.Of(theta)}
	return l, ok && l.elongation > 0 && l.distance > 0
}

// likelihood returns the log likelihood of all parts together, with scratch
// space of its own.
func (f *lensFit) likelihood() func(theta []float64) float64 {
	parts := make([]func(lens) float64, len(f.parts))
	for i, p := range f.parts {
		parts[i] = p.likelihood()
	}
	return func(theta []float64) float64 {
		l, ok := f.at(theta)
		if !ok {
			return math.Inf(-1)
		}
		sum := 0.0
		for _, p := range parts {
			sum += p(l)
		}
		return sum
	}
}

// draw draws the parameters: from the prior down, or around what a search among
// the lenses of the images has found.
func (f *lensFit) draw(ctx context.Context) (*infer.Sample, error) {
	if f.images == nil {
		return infer.DrawPosterior(ctx, infer.Problem{Free: f.parameters.Free, Likelihood: f.likelihood}, f.task.Sampling)
	}
	s, err := f.images.search(ctx)
	if err != nil {
		return nil, err
	}
	return f.drawAround(ctx, s)
}

// lnMass fills out with ln M(<r) at theta, components included.
func (f *lensFit) lnMass(theta, radii, out []float64) error {
	if err := f.halo.lnMass(theta, radii, out); err != nil {
		return err
	}
	if f.images != nil {
		f.images.addComponents(theta, radii, out)
	}
	return nil
}

// run draws the halo.
func (f *lensFit) run(ctx context.Context) (*infer.Draws, error) {
	if len(f.parameters.Free) == 0 {
		return nil, f.task.Errorf("every parameter is an exact number, so there is nothing to fit")
	}
	sample, err := f.draw(ctx)
	if err != nil {
		return nil, f.task.Errorf("%w", err)
	}
	best, ok := f.at(sample.Best)
	if !ok {
		return nil, f.task.Errorf("the best fit has no halo")
	}
	fit := estimate.Fit{
		Sample: sample, Parameters: &f.parameters, LnMass: f.lnMass, Derived: f.halo.derived(),
		Covers:  [2]float64{math.Inf(1), 0},
		Assumes: append(f.halo.assumes(f.task), assumed(f.task, f.shared()...)...),
	}
	for _, p := range f.parts {
		p.state(best, &fit)
	}
	fit.Dof = max(fit.Dof-f.halo.drawn, 0)
	return f.task.Finish(fit)
}

// shared lists the assumptions that all data share.
func (f *lensFit) shared() []method.Setting {
	return []method.Setting{distanceScaleSetting, elongationSetting}
}

// cover widens what a fit covers to hold lo and hi.
func cover(fit *estimate.Fit, lo, hi float64) {
	fit.Covers[0], fit.Covers[1] = min(fit.Covers[0], lo), max(fit.Covers[1], hi)
}
