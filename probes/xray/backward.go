package xray

import (
	"context"
	"fmt"
	"math"

	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

var backward = estimate.Method{
	Declaration: method.Declaration{
		Name:    "backward",
		Version: 1,
		Summary: "Puts gas of the measured density in hydrostatic equilibrium in a mass model and compares the temperatures with the spectra.",
		Equation: "n_e kT(r) = p_e + ∫ from r to r_e of μ m_p (1 − f) n_e G M(<r′)/r′² dr′,   p_e = η × the weight of the gas beyond r_e\n" +
			"kT of a bin = ∫ n² T^(1/4) dV / ∫ n² T^(−3/4) dV along the whole line of sight, divided by temperature_scale",
		Sources: []string{"Ettori et al. 2010", "Ettori et al. 2013", "Mazzotta et al. 2004", "Vikhlinin et al. 2006"},
		Data:    gasData,
		Settings: append([]method.Setting{
			haloSetting,
			massSetting,
			{
				Name: "concentration", Kind: method.Number, Low: 0.1, High: 100, Relation: relationNames(),
				Default: method.Distributed(prior.LogUniform(1, 20)),
				Doc:     "c_200c; wide by default, for the temperatures measure it themselves; with few bins give a relation. Not used by the isothermal models",
			},
			{
				Name: "shape", Kind: method.Number, Low: 0.02, High: 2,
				Default: method.Distributed(prior.LogNormal(0.18, 0.3)),
				Doc:     "α of the einasto model", Source: "Gao et al. 2008 (from memory)",
			},
			{
				Name: "core", Kind: method.Number, Unit: "kpc", Length: true, Low: 0.01, High: 5000,
				Default: method.Distributed(prior.LogUniform(5, 500)),
				Doc:     "core radius of the cored-isothermal model",
			},
			{
				Name: "outer_pressure_ratio", Kind: method.Number, Low: 1e-3, High: 1e3,
				Default: method.Distributed(prior.LogUniform(0.1, 10)),
				Doc:     "η, the thermal pressure at the outer edge of the temperatures over the weight of the gas beyond, as the density's form and the mass model continue; 1 where equilibrium holds to infinity",
				Source:  "Ettori et al. 2010 leave this pressure free",
			},
		}, gasAssumptions...),
		Cautions: gasCautions,
		Measured: "200 invented clusters, truths drawn from the priors, ten annuli, shells with errors of 3%: the 68% interval of M_500 holds the truth in 66.0 ± 3.3% of them, " +
			"the 95% interval in 93.5%; bias of ln M_500 +0.008 ± 0.008, typical error 0.10. Shells with errors of 15%: 68.5 ± 3.3% and 91.5%, bias -0.017 ± 0.009, error 0.11 " +
			"(STEELYARD_SLOW=1 go test -run TestCoverage ./probes/xray)",
	},
	Uses: []string{"density", "temperature"},
	Run:  runBackward,
}

// backwardFit is a fit of a mass model.
type backwardFit struct {
	*fit
	mass  estimate.Ref
	outer estimate.Ref
	halo  func(theta []float64) halo.Model
	shape []string // the settings that give the halo its shape
	// concentration at theta, nil where the model has none or it is drawn itself
	concentration func(theta []float64) float64
}

func newBackward(f *fit) (*backwardFit, error) {
	if f.spectra.Len() < 2 {
		return nil, f.task.Errorf("a single temperature bin says nothing of how the pressure falls; give two or more")
	}
	b := &backwardFit{fit: f}
	f.air = newAtmosphere(f.gas, f.spectra, nodesPerEfold)
	b.mass = f.parameters.Draw("mass_200c", "solMass", f.task.Settings["mass"].Prior)
	if err := b.chooseHalo(); err != nil {
		return nil, err
	}
	b.outer = f.parameters.Assume(f.task.Settings, "outer_pressure_ratio")
	if err := f.assume(); err != nil {
		return nil, err
	}
	f.predict = func(s *state, theta []float64) bool {
		eta := b.outer.Of(theta)
		if !f.sane(theta) || !(eta > 0) {
			return false
		}
		h := b.halo(theta)
		for j, r := range f.air.grid.r {
			s.mass[j] = h.Mass(r)
		}
		return f.support.fill(s.thermal, theta, h, f.air.grid.r) && f.air.solve(s, f.molecule.Of(theta), eta, f.drawn(theta))
	}
	return b, nil
}

// prepare fits the model with the quoted errors alone, and chooses which
// directions of the density's errors to draw.
func (b *backwardFit) prepare() (bestFit, error) {
	b.layModes()
	quoted, err := b.best(0, b.starts()...)
	if err != nil {
		return quoted, err
	}
	b.turn(quoted)
	return quoted, nil
}

// starts are scores of the first parameter: of the mass, if that is drawn, 2e13,
// 6e14 and 5e15 Msun by its default prior.
func (b *backwardFit) starts() []float64 {
	if b.mass.Drawn() {
		return []float64{-0.5, 0.5, 1.5}
	}
	return []float64{0}
}

// runBackward weighs the object by the backward method.
func runBackward(ctx context.Context, t *estimate.Task) (*infer.Draws, error) {
	f, err := newFit(t)
	if err != nil {
		return nil, err
	}
	b, err := newBackward(f)
	if err != nil {
		return nil, err
	}
	quoted, err := b.prepare()
	if err != nil {
		return nil, err
	}
	sample, err := infer.DrawPosterior(ctx, b.problem(), t.Sampling)
	if err != nil {
		return nil, t.Errorf("%w", err)
	}
	best, err := b.best(b.typicalScatter(sample), b.starts()...)
	if err != nil {
		return nil, err
	}
	b.drawRest(sample)
	return b.finish(sample, quoted, best)
}

// finish lays out the draws and says what the reader must know.
func (b *backwardFit) finish(sample *infer.Sample, quoted, best bestFit) (*infer.Draws, error) {
	s := b.air.newState()
	result := estimate.Fit{
		Sample: sample, Parameters: &b.parameters, Covers: b.covers(), Chi2: best.chi2, Dof: best.dof,
		LnMass: func(theta, radii, out []float64) error {
			h := b.halo(theta)
			for j, r := range radii {
				out[j] = math.Log(h.Mass(r))
			}
			return nil
		},
		Derived: []estimate.Derived{{Name: "outer_pressure", Unit: "keV cm**-3", Of: func(theta []float64) float64 {
			b.predict(s, theta)
			return s.pressure[b.air.grid.edge]
		}}},
		Assumes: append(b.model(), b.assumes()...),
		Checks:  []infer.Check{quoted.check()}, Warnings: b.warnings(quoted),
	}
	if b.concentration != nil {
		result.Derived = append(result.Derived, estimate.Derived{Name: "concentration", Of: b.concentration})
	}
	d, err := b.task.Finish(result)
	if err != nil {
		return nil, err
	}
	b.addGas(d, sample)
	return d, nil
}

// model says in words what the gas is held by.
func (b *backwardFit) model() []string {
	lines := []string{"gas in hydrostatic equilibrium in a spherical halo: " + b.task.Settings["halo"].Text}
	lines = append(lines, b.stated(b.shape...)...)
	lines = append(lines, fmt.Sprintf("thermal pressure free at %.4g kpc, where the temperatures end: η of the weight of the gas beyond", b.covers()[1]))
	return append(lines, b.stated("outer_pressure_ratio")...)
}
