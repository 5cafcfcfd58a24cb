package xray

import (
	"context"
	"fmt"
	"math"

	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/infer"
)

// backwardModel is a mass model and a density, turned into temperatures.
type backwardModel struct {
	task      *estimate.Task
	gas       *Gas
	spectra   *Spectra
	air       *atmosphere
	threshold float64 // 200 ρ_crit, Msun/kpc³

	parameters                               estimate.Parameters
	mass, outer                              estimate.Ref
	concentration                            estimate.Concentration
	scale, scatter, nonthermal, meanMolecule estimate.Ref
	fitted                                   int // parameters that the data alone determine
	moves                                    int // directions of the density's errors drawn with the rest
}

func newBackward(t *estimate.Task, gas *Gas, s *Spectra) (*backwardModel, error) {
	m := &backwardModel{task: t, gas: gas, spectra: s, air: newAtmosphere(gas, s, nodesPerEfold)}
	m.threshold = 200 * t.Cosmology.CriticalDensity(t.Object.Redshift)
	p := &m.parameters
	m.mass = p.Draw("mass_200c", "solMass", t.Settings["mass"].Prior)
	var err error
	if m.concentration, err = p.Concentration(t); err != nil {
		return nil, err
	}
	m.outer = p.Assume(t.Settings, "outer_pressure_ratio")
	m.fitted = len(p.Free)
	m.scale = p.Assume(t.Settings, "temperature_scale")
	m.nonthermal = p.Assume(t.Settings, "nonthermal_fraction")
	m.meanMolecule = p.Assume(t.Settings, "mean_molecular_weight")
	// Last, so that the rest can be fitted without it.
	m.scatter = p.Assume(t.Settings, "temperature_scatter")
	return m, nil
}

// halo returns the mass model at theta.
func (m *backwardModel) halo(theta []float64) halo.NFW {
	m200 := m.mass.Of(theta)
	return halo.NewNFW(m200, m.concentration.Of(theta, m200), m.threshold)
}

// solve sets the temperatures at theta, which holds the values of the
// parameters and then the moves of the density; false where the model is
// impossible.
func (m *backwardModel) solve(s *state, theta []float64) bool {
	h := m.halo(theta)
	for j, r := range m.air.grid.r {
		s.mass[j] = h.Mass(r)
	}
	f, mu, scale, eta := m.nonthermal.Of(theta), m.meanMolecule.Of(theta), m.scale.Of(theta), m.outer.Of(theta)
	if !(f < 1 && mu > 0 && scale > 0 && eta > 0) {
		return false
	}
	return m.air.solve(s, mu*(1-f), eta, theta[len(m.parameters.Free):])
}

// problem is the posterior: the parameters, and a unit normal for every drawn
// direction of the density's errors.
func (m *backwardModel) problem() infer.Problem {
	p := infer.Problem{Free: append([]infer.Free(nil), m.parameters.Free...)}
	for k := range m.moves {
		p.Free = append(p.Free, infer.Free{Name: fmt.Sprintf("density_%d", k+1), Prior: unitNormal})
	}
	p.Likelihood = func() func([]float64) float64 {
		s := m.air.newState()
		return func(theta []float64) float64 {
			if !m.solve(s, theta) {
				return math.Inf(-1)
			}
			ln := m.spectra.lnLikelihood(s.Bins, m.scale.Of(theta), m.scatter.Of(theta))
			if math.IsNaN(ln) {
				return math.Inf(-1)
			}
			return ln
		}
	}
	return p
}

// runBackward weighs the object by the backward method.
func runBackward(ctx context.Context, t *estimate.Task) (*infer.Draws, error) {
	gas, spectra := new(Gas), new(Spectra)
	if err := gas.UnmarshalBinary(t.Reduced["density"]); err != nil {
		return nil, t.Errorf("density: %w", err)
	}
	if err := spectra.UnmarshalBinary(t.Reduced["temperature"]); err != nil {
		return nil, t.Errorf("temperature: %w", err)
	}
	m, err := newBackward(t, gas, spectra)
	if err != nil {
		return nil, err
	}
	quoted, err := m.prepare()
	if err != nil {
		return nil, err
	}
	sample, err := infer.DrawPosterior(ctx, m.problem(), t.Sampling)
	if err != nil {
		return nil, t.Errorf("%w", err)
	}
	return m.finish(sample, quoted)
}

// finish lays out the draws and says what the reader must know.
func (m *backwardModel) finish(sample *infer.Sample, quoted bestFit) (*infer.Draws, error) {
	n, s := m.spectra.Len(), m.air.newState()
	best, err := m.fit(m.typicalScatter(sample))
	if err != nil {
		return nil, err
	}
	fit := estimate.Fit{
		Sample: sample, Parameters: &m.parameters,
		Covers: [2]float64{m.spectra.Inner[0], m.spectra.Outer[n-1]},
		Chi2:   best.chi2, Dof: best.dof,
		LnMass: func(theta, radii, out []float64) error {
			h := m.halo(theta)
			for j, r := range radii {
				out[j] = math.Log(h.Mass(r))
			}
			return nil
		},
		Derived: []estimate.Derived{{Name: "outer_pressure", Unit: "keV cm**-3", Of: func(theta []float64) float64 {
			m.solve(s, theta)
			return s.pressure[m.air.grid.edge]
		}}},
		Assumes: m.assumes(), Checks: []infer.Check{quoted.check()}, Warnings: m.warnings(quoted),
	}
	if m.concentration.Related() {
		fit.Derived = append(fit.Derived, estimate.Derived{Name: "concentration", Of: func(theta []float64) float64 {
			return m.concentration.Of(theta, m.mass.Of(theta))
		}})
	}
	return m.task.Finish(fit)
}

// typicalScatter is the median of the drawn scatter of spectral temperatures,
// or the exact number that stands for it.
func (m *backwardModel) typicalScatter(sample *infer.Sample) float64 {
	drawn := make([]float64, len(sample.Values))
	for i, theta := range sample.Values {
		drawn[i] = m.scatter.Of(theta)
	}
	return infer.Percentiles(drawn, 50)[0]
}
