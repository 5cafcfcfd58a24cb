package xray

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"

	"steelyard/probes/infer"
)

// fewShells is the number of shells below which a β model is fitted: the
// modified β model has six parameters.
const fewShells = 8

// secondComponent is the p-value below which one component of the modified β model is
// taken not to fit and a second is added.
const secondComponent = 0.05

// fitShells fits a form to the shells. With form "" a β model is taken for
// fewer than eight shells and a modified β model for more. The modified β model
// gets its second component only where one does not fit (p < 0.05), and where
// the second lowers χ² by more than 3 ln n, the criterion of Schwarz 1978 for
// its three parameters.
func fitShells(form Form, shells *Bins) (*Gas, error) {
	if form == "" {
		form = ModifiedBeta
		if shells.Len() < fewShells {
			form = Beta
		}
	}
	g, x, err := fitFamily(newFamily(form, shells), shells)
	if err != nil {
		return nil, err
	}
	if form == ModifiedBeta && g.Dof > 3 && infer.ChiSquareP(g.Chi2, g.Dof) < secondComponent {
		two, _, err := fitFamily(newFamily(form, shells).second(x, shells), shells)
		if err == nil && g.Chi2-two.Chi2 > 3*math.Log(float64(shells.Len())) {
			return two, nil
		}
	}
	return g, nil
}

// fitFamily fits the family to the shells by least squares, from each of its
// starts, and takes the errors from the curvature at the best.
func fitFamily(f *family, shells *Bins) (*Gas, []float64, error) {
	s := newShellFit(f, shells)
	best, least, settled := []float64(nil), math.Inf(1), false
	for _, start := range f.starts {
		if x, sum, ok := leastSquares(s.residuals, s.size(), start); sum < least {
			best, least, settled = x, sum, ok
		}
	}
	if best == nil {
		return nil, nil, fmt.Errorf("%s cannot be fitted to these shells", f.words)
	}
	j := jacobian(s.residuals, best, s.size())
	var normal mat.SymDense
	normal.SymOuterK(1, j.T())
	var chol mat.Cholesky
	if !chol.Factorize(&normal) {
		return nil, nil, fmt.Errorf("the errors of %s cannot be found from these shells", f.words)
	}
	// With the normal matrix N = U'U, U⁻¹ times unit normals are the errors.
	var upper, inverse mat.TriDense
	chol.UTo(&upper)
	if err := inverse.InverseTri(&upper); err != nil {
		return nil, nil, fmt.Errorf("the errors of %s cannot be found from these shells: %w", f.words, err)
	}
	r, n := make([]float64, s.size()), shells.Len()
	s.residuals(best, r)
	g := &Gas{
		Form: f.form, Parameters: f.parameters(best), Words: f.words,
		Inner: shells.Inner[0], Outer: shells.Outer[n-1],
		Chi2: floats.Dot(r[:n], r[:n]), Dof: max(n-len(best), 0), Shells: n, Notes: shells.Notes,
	}
	for k := range best {
		move := make([]float64, len(g.Parameters))
		for i, c := range f.fitted {
			move[c.index] = inverse.At(i, k) * c.derivative(best[i])
		}
		g.Moves = append(g.Moves, move)
	}
	if !settled {
		g.Notes = append(g.Notes, "the fit of the density did not settle on one minimum")
	}
	return g, best, nil
}
