package xray

import (
	"math"
	"testing"
)

// The likelihood is a probability density of the data: it integrates to one for
// any model, two-sided errors and scatter included.
func TestLikelihoodIsNormalised(t *testing.T) {
	s := annuli(0, 100)
	s.Minus[0], s.Plus[0] = 0.2, 0.5
	for _, c := range []struct{ model, scale, scatter float64 }{{5, 1, 0}, {5, 1, 0.1}, {6, 1.12, 0.03}} {
		sum := 0.0
		const step = 1e-3
		for v := -5.0; v < 15; v += step {
			s.Value[0] = v + step/2
			sum += math.Exp(s.lnLikelihood([]float64{c.model}, c.scale, c.scatter)) * step
		}
		// The midpoint rule meets a kink at the model, which costs step².
		near(t, "sum over the data", sum, 1, 1e-6)
	}
}

// The side of the error is chosen by the model, and the likelihood has no step
// where the model crosses the datum.
func TestTwoSidedErrors(t *testing.T) {
	s := annuli(0, 100)
	s.Value[0], s.Minus[0], s.Plus[0] = 6, 0.2, 0.5
	at := func(model float64) float64 { return s.lnLikelihood([]float64{model}, 1, 0) }
	near(t, "model one upper error above", at(6)-at(6.5), 0.5, 1e-12)
	near(t, "model one lower error below", at(6)-at(5.8), 0.5, 1e-12)
	near(t, "just above against just below", at(6+1e-9), at(6-1e-9), 1e-9)
	near(t, "pull above", s.chi2([]float64{7}, 1, 0), 4, 1e-12)
	near(t, "pull below", s.chi2([]float64{5.8}, 1, 0), 1, 1e-12)
	// Quoted = true / scale: gas 12% hotter than the datum agrees with it.
	near(t, "scale", 1+s.chi2([]float64{6 * 1.12}, 1.12, 0), 1, 1e-12)
	// Scatter is a fraction of the model: √(0.5² + (0.1·7)²).
	near(t, "scatter", s.chi2([]float64{7}, 1, 0.1), 1/(0.25+0.49), 1e-12)
}

func TestScatterNeeded(t *testing.T) {
	s := annuli(0, 1, 2, 3, 4)
	kT := []float64{5.5, 4.5, 5.5, 4.5}
	for i := range s.Minus {
		s.Minus[i], s.Plus[i] = 0.1, 0.1
	}
	x := s.scatterNeeded(kT, 1, 2)
	near(t, "χ² with the scatter needed", s.chi2(kT, 1, x), 2, 1e-6)
	if x := s.scatterNeeded(kT, 1, 1000); x != 0 {
		t.Errorf("scatter %g where none is needed", x)
	}
}
