package xray

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"

	"steelyard/probes/infer"
	"steelyard/probes/prior"
)

var unitNormal = func() prior.Prior {
	p, err := prior.Normal(0, 1)
	if err != nil {
		panic("xray: " + err.Error())
	}
	return p
}()

// bestFit is the best fit for a given scatter of spectral temperatures.
type bestFit struct {
	theta  []float64 // parameters, then the density's moves
	chi2   float64   // of the temperatures, the density's moves and the assumptions with a prior
	dof    int
	pValue float64
}

// leastInfluence is the smallest effect on the temperatures, in units of their
// errors and summed over the bins in quadrature, for which a direction of the
// density's errors is drawn. One left out would have widened the error of the
// mass by at most half its square, 2%.
const leastInfluence = 0.2

// prepare fits the model with the quoted errors alone, and chooses the
// directions of the density's errors that the temperatures can feel: the
// singular vectors of the temperatures' response. They alone reach the mass,
// and they are drawn with the rest, so that the temperatures have their say in
// the density too.
func (m *backwardModel) prepare() (bestFit, error) {
	for k := range m.gas.Moves {
		phi := make([]float64, len(m.air.grid.r))
		for j, r := range m.air.grid.r {
			phi[j] = m.gas.Mode(k, r)
		}
		m.air.modes = append(m.air.modes, phi)
	}
	m.moves = len(m.air.modes)
	q, err := m.fit(0)
	if err != nil {
		return q, err
	}
	m.turn(q)
	return q, nil
}

// fit minimises χ², with the given scatter, plus the squared prior scores of
// everything that is drawn. The χ² returned leaves out the scores of what the
// temperatures alone determine (mass, concentration, outer pressure).
func (m *backwardModel) fit(scatter float64) (bestFit, error) {
	n, s, free := m.spectra.Len(), m.air.newState(), m.parameters.Free
	theta := make([]float64, len(free)+m.moves)
	residuals := func(x, out []float64) {
		for i, f := range free {
			theta[i] = f.Prior.FromScore(x[i])
		}
		copy(theta[len(free):], x[len(free):])
		copy(out[n:], x)
		if !m.solve(s, theta) {
			for i := range out[:n] {
				out[i] = impossible
			}
			return
		}
		m.spectra.pulls(s.Bins, m.scale.Of(theta), scatter, out[:n])
	}
	best, least := []float64(nil), math.Inf(1)
	for _, start := range []float64{-0.5, 0.5, 1.5} { // of the mass: 2e13, 6e14, 5e15 Msun by default
		x := make([]float64, len(theta))
		if m.mass.Drawn() {
			x[0] = start
		}
		if x, sum, _ := leastSquares(residuals, n+len(x), x); sum < least {
			best, least = x, sum
		}
	}
	if best == nil || least >= impossible*impossible {
		return bestFit{}, m.task.Errorf("no mass allowed by its prior can hold this gas: its weight beyond the data is infinite, or no temperature comes out positive")
	}
	out := make([]float64, n+len(best))
	residuals(best, out)
	b := bestFit{theta: theta, dof: max(n-m.fitted, 0), pValue: 1}
	b.chi2 = floats.Dot(out[:n], out[:n]) + floats.Dot(best[m.fitted:], best[m.fitted:])
	if b.dof > 0 {
		b.pValue = infer.ChiSquareP(b.chi2, b.dof)
	}
	return b, nil
}

// impossible is the pull of every bin where the model has no answer.
const impossible = 1e6

// turn replaces the directions of the density's errors by those that move the
// temperatures most, independent of one another, and drops the rest.
func (m *backwardModel) turn(q bestFit) {
	if m.moves == 0 {
		return
	}
	n, s := m.spectra.Len(), m.air.newState()
	theta, first := append([]float64(nil), q.theta...), len(m.parameters.Free)
	m.solve(s, theta)
	model := append([]float64(nil), s.Bins...)
	scatter := m.scatter.Of(theta)
	if m.scatter.Drawn() {
		scatter = m.spectra.scatterNeeded(model, m.scale.Of(theta), q.dof)
	}
	response := mat.NewDense(n, m.moves, nil)
	for k := range m.moves {
		at := theta[first+k]
		theta[first+k] = at + 0.5
		m.solve(s, theta)
		up := append([]float64(nil), s.Bins...)
		theta[first+k] = at - 0.5
		m.solve(s, theta)
		theta[first+k] = at
		for i := range n {
			below, above := m.spectra.sides(i, model[i]/m.scale.Of(theta), scatter)
			response.Set(i, k, (up[i]-s.Bins[i])/m.scale.Of(theta)/((below+above)/2))
		}
	}
	var svd mat.SVD
	if !svd.Factorize(response, mat.SVDThin) {
		return // draw all directions
	}
	var v mat.Dense
	svd.VTo(&v)
	var modes [][]float64
	for l, influence := range svd.Values(nil) {
		if influence < leastInfluence {
			break
		}
		phi := make([]float64, len(m.air.grid.r))
		for k, old := range m.air.modes {
			floats.AddScaled(phi, v.At(k, l), old)
		}
		modes = append(modes, phi)
	}
	m.air.modes, m.moves = modes, len(modes)
}

// scatterNeeded is the fractional scatter that brings χ² down to dof, 0 when it
// is there already.
func (s *Spectra) scatterNeeded(kT []float64, scale float64, dof int) float64 {
	lo, hi := 0.0, 1.0
	if s.chi2(kT, scale, lo) <= float64(dof) {
		return 0
	}
	for range 30 {
		if mid := (lo + hi) / 2; s.chi2(kT, scale, mid) > float64(dof) {
			lo = mid
		} else {
			hi = mid
		}
	}
	return hi
}

// check prints the fit with the quoted errors alone.
func (q bestFit) check() infer.Check {
	c := infer.Check{Name: "chi2 with the quoted errors alone", Statistic: q.chi2, PValue: -1, Passed: true}
	if q.dof > 0 {
		c.PValue, c.Passed = q.pValue, q.pValue >= poorFit
		c.Note = fmt.Sprintf("χ² = %.1f for %d degrees of freedom without any scatter of spectral temperatures", q.chi2, q.dof)
	}
	return c
}
