// Package reported takes a mass that someone published and carries it to the
// cosmology of the recipe, so that it can be compared.
//
// What was observed is angles, redshifts, temperatures, shears; the mass was
// made from them with distances. In another cosmology the same observations,
// inside the same angle, give another mass. How it changes depends on how it was
// made: see Settings, attribute `via`.
package reported

import (
	"context"
	"fmt"
	"maps"
	"math"

	"steelyard/probes/cosmology"
	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/infer"
)

// Version is raised whenever the same input would give other numbers.
const Version = 1

// Estimate draws a published mass with its error, carries it from the cosmology
// it was stated in (nil for the task's own) to the task's, and lays it along an
// NFW halo. The task's settings are those of Settings.
//
// An overdensity needs care: the published radius R_Δ belongs to the stated
// cosmology. The halo through M_Δ and R_Δ there is scaled at fixed angle, and
// its R_Δ in the new cosmology is found anew from the critical density there.
func Estimate(_ context.Context, t *estimate.Task, stated *cosmology.Cosmology) (*infer.Draws, error) {
	p, err := read(t, stated)
	if err != nil {
		return nil, err
	}
	sample := p.parameters.DrawPriors(t.Sampling)
	spare := t.Sampling.Stream.Sub("reported mass").Rand(0)
	inside := make([]float64, len(sample.Values)) // radius the mass is inside of, kpc
	for i, theta := range sample.Values {
		// A mass is positive: the tail of a wide error below zero is drawn again.
		for try := 0; theta[0] <= 0; try++ {
			if try == 1000 {
				return nil, t.Errorf("the error of the mass leaves no positive values")
			}
			theta[0] = t.Settings["mass"].Prior.FromScore(spare.NormFloat64())
		}
		h, err := p.carried(theta)
		if err != nil {
			return nil, err
		}
		r200, err := halo.RadiusAt(h, p.threshold200)
		if err != nil {
			return nil, t.Errorf("the halo of a mass of %.3g Msun has no r_200: %v", theta[0], err)
		}
		theta[p.solved] = 4 * math.Pi / 3 * p.threshold200 * r200 * r200 * r200
		theta[p.solved+1] = h.Rs
		if p.concentration.Related() {
			theta[p.solved+2] = r200 / h.Rs
		}
		if inside[i], err = p.radius(h); err != nil {
			return nil, err
		}
	}
	covers := infer.Percentiles(inside, 16, 84)
	// Finish reads `mass` as a prior on M_200c; here it is the datum.
	task := *t
	task.Settings = maps.Clone(t.Settings)
	delete(task.Settings, "mass")
	return task.Finish(estimate.Fit{
		Sample: sample, Parameters: &p.parameters, LnMass: p.lnMass,
		Covers:   [2]float64{covers[0], covers[1]},
		Assumes:  p.assumes(),
		Warnings: p.warnings(),
	})
}

// carried returns the halo in the task's cosmology.
func (p *published) carried(theta []float64) (halo.NFW, error) {
	mass := theta[0]
	if p.via.projected {
		e := p.elongation.Of(theta)
		if !(e > 0) {
			return halo.NFW{}, p.task.Errorf("elongation must be positive; its prior reaches %.3g", e)
		}
		mass /= e
	}
	if c := p.concentration.Of(theta, 1e14); !(c > 0) {
		return halo.NFW{}, p.task.Errorf("concentration must be positive; its prior reaches %.3g", c)
	}
	h, err := p.there.Carry(mass, p.anchor, p.concentration, theta)
	if err != nil {
		return h, err
	}
	return p.via.move(h, p)
}

// radius is where the mass was quoted, in the task's cosmology: the same angle,
// or the same overdensity.
func (p *published) radius(h halo.NFW) (float64, error) {
	if p.anchor.Radius > 0 {
		return p.anchor.Radius * p.stretch, nil
	}
	threshold, err := p.definition.Threshold(p.task.Cosmology, p.task.Object.Redshift)
	if err != nil {
		return 0, p.task.Errorf("%w", err)
	}
	return halo.RadiusAt(h, threshold)
}

func (p *published) lnMass(theta, radii, out []float64) error {
	r200 := math.Cbrt(theta[p.solved] / (4 * math.Pi / 3 * p.threshold200))
	h := halo.NewNFW(theta[p.solved], r200/theta[p.solved+1], p.threshold200)
	for j, r := range radii {
		out[j] = math.Log(h.Mass(r))
	}
	return nil
}

func (p *published) assumes() []string {
	s := p.task.Settings
	lines := []string{fmt.Sprintf("mass: %s Msun as published%s", s["mass"].Prior, p.source())}
	lines = append(lines, p.where(), p.via.line(p))
	if v := s["concentration"]; v.Relation != "" {
		lines = append(lines, fmt.Sprintf("carried to other radii along an NFW halo with the concentration of %s and its scatter", v.Relation))
	} else {
		lines = append(lines, fmt.Sprintf("carried to other radii along an NFW halo with concentration %s", v.Prior))
	}
	if p.anchor.Projected {
		lines = append(lines, "the cylinder is taken along an infinite line of sight through that halo")
	}
	return lines
}

func (p *published) source() string {
	if text := p.task.Settings["source"].Text; text != "" {
		return " (" + text + ")"
	}
	return ""
}

func (p *published) where() string {
	switch {
	case p.anchor.Projected:
		return fmt.Sprintf("inside the cylinder of %.4g kpc (as stated)", p.anchor.Radius)
	case p.anchor.Radius > 0:
		return fmt.Sprintf("inside %.4g kpc (as stated)", p.anchor.Radius)
	case p.definition.Of == "virial":
		return "inside the virial radius of its cosmology"
	}
	return fmt.Sprintf("inside %g times the %s density of its cosmology", p.definition.Delta, p.definition.Of)
}

func (p *published) warnings() []string {
	if p.task.Settings["probe"].Text != "sz" {
		return nil
	}
	return []string{"a mass from the SZ effect is usually calibrated on X-ray masses: it is then no evidence independent of them"}
}
