package xray

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/floats"

	"steelyard/probes/estimate"
	"steelyard/probes/infer"
	"steelyard/probes/prior"
)

// fit compares temperatures with the spectra: what the hydrostatic methods
// share. A point theta in its space holds the values of the parameters, then
// the moves of the density along its drawn directions, then, once drawn, those
// along the directions that the temperatures do not feel.
type fit struct {
	task    *estimate.Task
	gas     *Gas
	spectra *Spectra
	air     *atmosphere

	parameters estimate.Parameters
	fitted     int // the first of the parameters, which the temperatures alone determine
	moves      int // directions of the density's errors drawn with the rest
	scale      estimate.Ref
	support    support
	molecule   estimate.Ref
	scatter    estimate.Ref
	// predict sets the temperatures of the bins at theta; false where the model is
	// impossible.
	predict func(s *state, theta []float64) bool
}

// newFit reads the reductions. The method then adds what it fits, and last the
// assumptions.
func newFit(t *estimate.Task) (*fit, error) {
	f := &fit{task: t, gas: new(Gas), spectra: new(Spectra)}
	if err := f.gas.UnmarshalBinary(t.Reduced["density"]); err != nil {
		return nil, t.Errorf("density: %w", err)
	}
	if err := f.spectra.UnmarshalBinary(t.Reduced["temperature"]); err != nil {
		return nil, t.Errorf("temperature: %w", err)
	}
	return f, nil
}

// assume adds the assumptions, the scatter of temperatures last, so that the
// rest can be fitted without it.
func (f *fit) assume() error {
	f.fitted = len(f.parameters.Free)
	f.scale = f.parameters.Assume(f.task.Settings, "temperature_scale")
	var err error
	f.support, err = f.newSupport()
	f.molecule = f.parameters.Assume(f.task.Settings, "mean_molecular_weight")
	f.scatter = f.parameters.Assume(f.task.Settings, "temperature_scatter")
	return err
}

// drawn are the density's moves at theta.
func (f *fit) drawn(theta []float64) []float64 {
	first := len(f.parameters.Free)
	return theta[first : first+f.moves]
}

// sane reports whether the assumptions at theta have a meaning.
func (f *fit) sane(theta []float64) bool {
	share, _ := f.support.thermal(theta, 1)
	return share > 0 && f.molecule.Of(theta) > 0 && f.scale.Of(theta) > 0
}

// problem is the posterior: the parameters, and a unit normal for every drawn
// direction of the density's errors.
func (f *fit) problem() infer.Problem {
	p := infer.Problem{Free: append([]infer.Free(nil), f.parameters.Free...)}
	for k := range f.moves {
		p.Free = append(p.Free, infer.Free{Name: fmt.Sprintf("density_%d", k+1), Prior: unitNormal})
	}
	p.Likelihood = func() func([]float64) float64 {
		s := f.air.newState()
		return func(theta []float64) float64 {
			if !f.predict(s, theta) {
				return math.Inf(-1)
			}
			ln := f.spectra.lnLikelihood(s.Bins, f.scale.Of(theta), f.scatter.Of(theta))
			if math.IsNaN(ln) {
				return math.Inf(-1)
			}
			return ln
		}
	}
	return p
}

var unitNormal = func() prior.Prior {
	p, err := prior.Normal(0, 1)
	if err != nil {
		panic("xray: " + err.Error())
	}
	return p
}()

// bestFit is the best fit for a given scatter of spectral temperatures.
type bestFit struct {
	theta  []float64
	chi2   float64 // of the temperatures, the density's moves and the assumptions with a prior
	dof    int
	pValue float64
}

// impossible is the pull of every bin where the model has no answer.
const impossible = 1e6

// best minimises χ², with the given scatter, plus the squared prior scores of
// everything that is drawn, from each of the starts (scores of the first
// parameter). The χ² returned leaves out the scores of what the temperatures
// alone determine. An error when the model is possible nowhere.
func (f *fit) best(scatter float64, starts ...float64) (bestFit, error) {
	n, s, free := f.spectra.Len(), f.air.newState(), f.parameters.Free
	theta := make([]float64, len(free)+f.moves)
	out := make([]float64, n+len(theta))
	residuals := func(x, out []float64) {
		for i, p := range free {
			theta[i] = p.Prior.FromScore(x[i])
		}
		copy(theta[len(free):], x[len(free):])
		copy(out[n:], x)
		if !f.predict(s, theta) {
			for i := range out[:n] {
				out[i] = impossible
			}
			return
		}
		f.spectra.pulls(s.Bins, f.scale.Of(theta), scatter, out[:n])
	}
	var best []float64
	least := math.Inf(1)
	for _, start := range starts {
		x := make([]float64, len(theta))
		if len(x) > 0 {
			x[0] = start
		}
		x, sum, _ := leastSquares(residuals, n+len(x), x)
		if residuals(x, out); sum < least && out[0] != impossible {
			best, least = x, sum
		}
	}
	if best == nil {
		return bestFit{}, f.task.Errorf("no model allowed by the priors can hold this gas: its weight beyond the data is infinite, or no temperature comes out positive")
	}
	residuals(best, out)
	b := bestFit{theta: theta, dof: max(n-f.fitted, 0), pValue: 1}
	b.chi2 = floats.Dot(out[:n], out[:n]) + floats.Dot(best[f.fitted:], best[f.fitted:])
	if b.dof > 0 {
		b.pValue = infer.ChiSquareP(b.chi2, b.dof)
	}
	return b, nil
}

// typicalScatter is the median of the drawn scatter of spectral temperatures,
// or the exact number that stands for it.
func (f *fit) typicalScatter(sample *infer.Sample) float64 {
	drawn := make([]float64, len(sample.Values))
	for i, theta := range sample.Values {
		drawn[i] = f.scatter.Of(theta)
	}
	return infer.Percentiles(drawn, 50)[0]
}

// check prints the fit with the quoted errors alone; the words about a poor one
// are among the warnings.
func (b bestFit) check() infer.Check {
	c := infer.Check{Name: "chi2 with the quoted errors alone", Statistic: b.chi2, PValue: -1, Passed: true}
	if b.dof > 0 {
		c.PValue, c.Passed = b.pValue, b.pValue >= poorFit
	}
	return c
}
