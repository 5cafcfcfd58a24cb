package xray

import (
	"context"
	"fmt"
	"math"

	"steelyard/probes/estimate"
	"steelyard/probes/infer"
	"steelyard/probes/method"
)

var forward = estimate.Method{
	Declaration: method.Declaration{
		Name:    "forward",
		Version: 1,
		Summary: "Fits forms to the density and the temperature, and takes the mass from their slopes.",
		Equation: "M(<r) = −(kT r / G μ m_p (1 − f)) (d ln n_e/d ln r + d ln T/d ln r)\n" +
			"kT of a bin = ∫ n² T^(1/4) dV / ∫ n² T^(−3/4) dV along the whole line of sight, divided by temperature_scale",
		Sources: []string{"Vikhlinin et al. 2006", "Mazzotta et al. 2004"},
		Data:    gasData,
		Settings: append([]method.Setting{{
			Name: "temperature_form", Kind: method.Choice, Choices: []string{"by-bins", shortForm, coolCoreForm, fullForm}, Default: method.Word("by-bins"),
			Doc: "the form of the temperature: `full` is eq. 6 of Vikhlinin et al. 2006 with a = 0 (seven parameters), `cool-core` has b = 2 and acool = 1.9 besides (five), " +
				"`short` is kT = T0 (1 + (r/rt)²)^(-c/2); `by-bins` takes the short one for fewer than six bins and the full one from twelve",
			Source: "Vikhlinin et al. 2006",
		}}, gasAssumptions...),
		Cautions: append([]string{
			"no mass model holds the slopes together: a draw whose mass falls with radius inside the data is left out, and the share left out is printed",
			"outside the temperatures the forms' mass is followed only as long as it rises",
		}, gasCautions...),
	},
	Uses: []string{"density", "temperature"},
	Run:  runForward,
}

// forwardFit is a fit of a temperature form.
type forwardFit struct {
	*fit
	form *temperatureFit
}

// newForward prepares the fit of a version of the temperature's form, "by-bins"
// for the one that the number of bins can bear.
func newForward(f *fit, version string) (*forwardFit, error) {
	n := f.spectra.Len()
	if n < 3 && version != isothermal {
		return nil, f.task.Errorf("%d temperature bin(s); a temperature profile needs at least 3 for the method forward", n)
	}
	w := &forwardFit{fit: f}
	f.air = newAtmosphere(f.gas, f.spectra, nodesPerEfold)
	if version == "by-bins" {
		version = versionFor(n)
	}
	var err error
	if w.form, err = newTemperatureFit(&f.parameters, version, f.spectra); err != nil {
		return nil, f.task.Errorf("%w", err)
	}
	if err := f.assume(); err != nil {
		return nil, err
	}
	f.predict = func(s *state, theta []float64) bool {
		if !f.sane(theta) {
			return false
		}
		t := w.form.at(theta)
		for j, ln := range f.air.grid.ln {
			s.kT[j] = t.kT(ln)
			if !(s.kT[j] > 0) || math.IsInf(s.kT[j], 1) {
				return false
			}
		}
		f.air.move(s, f.drawn(theta))
		f.air.look(s)
		return true
	}
	return w, nil
}

// runForward weighs the object by the forward method.
func runForward(ctx context.Context, t *estimate.Task) (*infer.Draws, error) {
	f, err := newFit(t)
	if err != nil {
		return nil, err
	}
	return f.fromSlopes(ctx, t.Settings["temperature_form"].Text)
}

// fromSlopes fits a version of the temperature's form and takes the mass from
// the slopes.
func (f *fit) fromSlopes(ctx context.Context, version string) (*infer.Draws, error) {
	t := f.task
	w, err := newForward(f, version)
	if err != nil {
		return nil, err
	}
	w.layModes()
	quoted, err := w.best(0, 0)
	if err != nil {
		return nil, err
	}
	w.turn(quoted)
	// Draws with an impossible mass are left out afterwards, so twice as many are
	// made as are needed.
	wanted := t.Sampling.Draws
	if wanted == 0 {
		wanted = 4000
	}
	options := t.Sampling
	options.Draws = 2 * wanted
	sample, err := infer.DrawPosterior(ctx, w.problem(), options)
	if err != nil {
		return nil, t.Errorf("%w", err)
	}
	best, err := w.best(w.typicalScatter(sample), 0)
	if err != nil {
		return nil, err
	}
	w.drawRest(sample)
	m := w.newSlopes()
	excluded, err := w.leaveOut(sample, m, wanted)
	if err != nil {
		return nil, err
	}
	return w.finish(sample, m, quoted, best, excluded)
}

// leaveOut keeps wanted draws, evenly spread over those whose mass rises with
// radius inside the data, and returns the share of those whose does not.
func (w *forwardFit) leaveOut(sample *infer.Sample, m *slopes, wanted int) (float64, error) {
	var kept [][]float64
	for _, theta := range sample.Values {
		if m.rises(theta) {
			kept = append(kept, theta)
		}
	}
	share := float64(len(kept)) / float64(len(sample.Values))
	if share < 0.05 {
		return 0, w.task.Errorf("the mass falls with radius inside the data in %.0f%% of the draws: the density and temperature profiles do not describe gas in equilibrium; try the method backward", 100*(1-share))
	}
	sample.Values = make([][]float64, wanted)
	for i := range sample.Values {
		sample.Values[i] = kept[(2*i+1)*len(kept)/(2*wanted)]
	}
	sample.Quality.EffectiveDraws = math.Min(sample.Quality.EffectiveDraws*share, float64(wanted))
	sample.Quality.LogEvidence += math.Log(share)
	return 1 - share, nil
}

// finish lays out the draws and says what the reader must know.
func (w *forwardFit) finish(sample *infer.Sample, m *slopes, quoted, best bestFit, excluded float64) (*infer.Draws, error) {
	result := estimate.Fit{
		Sample: sample, Parameters: &w.parameters, Covers: w.covers(), Chi2: best.chi2, Dof: best.dof,
		LnMass: m.lnMass,
		Assumes: append([]string{
			"gas in hydrostatic equilibrium in a spherical mass; no mass model, and no prior on the mass but through those of the temperature's form",
			"temperature: " + w.form.words,
		}, w.assumes()...),
		Checks: []infer.Check{quoted.check(), {
			Name: "share of draws whose mass falls with radius", Statistic: excluded, PValue: -1, Passed: excluded < 0.5,
		}},
		Warnings: w.warnings(quoted),
	}
	if excluded > 0.2 {
		result.Warnings = append(result.Warnings, fmt.Sprintf("%.0f%% of the draws were left out because their mass falls with radius inside the data: the profiles carry more structure than the bins support", 100*excluded))
	}
	d, err := w.task.Finish(result)
	if err != nil {
		return nil, err
	}
	w.addGas(d, sample)
	return d, nil
}
