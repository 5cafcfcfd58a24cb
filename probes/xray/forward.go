package xray

import (
	"context"
	"fmt"
	"math"

	"steelyard/probes/constants"
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
		Data:    [][]string{{"density", "temperature"}},
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
			Name: "mass falls with radius", Statistic: excluded, PValue: -1, Passed: excluded < 0.5,
			Note: fmt.Sprintf("%.1f%% of the draws had a mass that falls with radius inside the data and were left out", 100*excluded),
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

// slopes gives the mass of a draw from the slopes of its density and
// temperature, at fixed radii.
type slopes struct {
	*forwardFit
	inside slopeTable // radii in the data, where the mass must rise
	grid   slopeTable // radii of the result
}

// slopeTable holds d ln n_e/d ln r at some radii, and its moves.
type slopeTable struct {
	ln    []float64
	base  []float64
	moves [][]float64
}

// checks is the number of radii inside the data at which the mass must rise.
const checks = 30

func (w *forwardFit) newSlopes() *slopes {
	covers := w.covers()
	// The first bin's gas lies about its middle.
	from := math.Log((w.spectra.Inner[0] + w.spectra.Outer[0]) / 2)
	to := math.Log(covers[1])
	var lnInside, lnGrid []float64
	for i := range checks {
		lnInside = append(lnInside, from+(to-from)*float64(i)/(checks-1))
	}
	for _, r := range infer.Grid() {
		lnGrid = append(lnGrid, math.Log(r))
	}
	table := func(ln []float64) slopeTable {
		t := slopeTable{ln: ln, moves: make([][]float64, len(w.gas.Moves))}
		for _, x := range ln {
			r := math.Exp(x)
			t.base = append(t.base, w.gas.Form.slope(w.gas.Parameters, r))
			for k := range t.moves {
				t.moves[k] = append(t.moves[k], w.gas.ModeSlope(k, r))
			}
		}
		return t
	}
	return &slopes{w, table(lnInside), table(lnGrid)}
}

// mass is the mass in Msun at entry i of the table, for gas all of whose
// pressure is thermal but for the share that support gives at r/r200m; not
// positive where the pressure rises outwards.
func (m *slopes) mass(theta []float64, t *temperature, at *slopeTable, i int, r200m float64) float64 {
	r := math.Exp(at.ln[i])
	thermal, bend := m.support.thermal(theta, r/r200m)
	// The whole pressure is n_e kT/(1 − f).
	slope := at.base[i] + t.slope(at.ln[i]) - bend
	for k, z := range theta[len(m.parameters.Free):] {
		slope += z * at.moves[k][i]
	}
	return -constants.HydrostaticMass / (m.molecule.Of(theta) * thermal) * t.kT(at.ln[i]) * r * slope
}

// radius200m is r_200m of the draw, which the radial share of the pressure
// needs: found from the mass that the share itself gives, by going round until
// it settles. 1 where the share is constant; not positive where it has none.
func (m *slopes) radius200m(theta []float64, t *temperature) float64 {
	if !m.support.radial {
		return 1
	}
	r := 1000.0
	for range 30 {
		last := r
		// The outermost radius inside which the mean density is high enough.
		inside := -1
		var excess [2]float64
		for i := len(m.grid.ln) - 1; i >= 0; i-- {
			volume := 4 * math.Pi / 3 * math.Exp(3*m.grid.ln[i]) * m.support.threshold
			e := math.Log(m.mass(theta, t, &m.grid, i, last) / volume)
			if e >= 0 {
				inside, excess[0] = i, e
				break
			}
			excess[1] = e
		}
		if inside < 0 || inside == len(m.grid.ln)-1 || math.IsNaN(excess[1]) {
			return 0
		}
		step := m.grid.ln[inside+1] - m.grid.ln[inside]
		r = math.Exp(m.grid.ln[inside] + step*excess[0]/(excess[0]-excess[1]))
		if math.Abs(r/last-1) < 1e-6 {
			break
		}
	}
	return r
}

// rises reports whether the mass is positive and rises at all radii inside the
// data.
func (m *slopes) rises(theta []float64) bool {
	t := m.form.at(theta)
	r200m := m.radius200m(theta, &t)
	last := 0.0
	for i := range m.inside.ln {
		mass := m.mass(theta, &t, &m.inside, i, r200m)
		if !(mass > last && r200m > 0) {
			return false
		}
		last = mass
	}
	return true
}

// lnMass fills out with ln of the mass at the radii of the result. Outside the
// data the forms' mass is followed as long as it rises, no faster than r³;
// where it does not, it stays.
func (m *slopes) lnMass(theta, radii, out []float64) error {
	t := m.form.at(theta)
	r200m := m.radius200m(theta, &t)
	from, to := m.inside.ln[0], m.inside.ln[checks-1]
	first, last := len(radii), -1
	for i, ln := range m.grid.ln {
		out[i] = math.Log(m.mass(theta, &t, &m.grid, i, r200m)) // NaN where negative
		if ln >= from && ln <= to {
			first, last = min(first, i), i
		}
	}
	if last < 0 {
		return fmt.Errorf("no radius of the result lies inside the data, %.4g kpc to %.4g kpc", math.Exp(from), math.Exp(to))
	}
	step := func(i int) float64 { // from i to i+1
		rise, most := out[i+1]-out[i], 3*(m.grid.ln[i+1]-m.grid.ln[i])
		if !(rise > 0) {
			return 0
		}
		return math.Min(rise, most)
	}
	outwards := make([]float64, len(radii))
	for i := range radii[1:] {
		outwards[i] = step(i)
	}
	for i := first - 1; i >= 0; i-- {
		out[i] = out[i+1] - outwards[i]
	}
	for i := last; i < len(radii)-1; i++ {
		out[i+1] = out[i] + outwards[i]
	}
	return nil
}
