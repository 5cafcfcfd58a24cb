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

// secondComponent is the p-value below which one component of the modified β
// model is taken not to fit and a second is added.
const secondComponent = 0.05

// density is what a form is fitted to: shells of electron density, or annuli of
// surface brightness.
type density struct {
	data    *Bins
	words   string                              // what the bins are, for the reader
	shells  *Bins                               // about the densities there, for first guesses
	predict func(f Form) func(p, out []float64) // what the data would be
	// background is fitted beside the form, as the parameter behind the form's;
	// its index is not used. None when sd is 0: then it is mean exactly.
	background coordinate
}

// ofShells is the density known in shells.
func ofShells(shells *Bins) density {
	return density{data: shells, shells: shells, words: "shells", predict: func(f Form) func(p, out []float64) { return shellMeans(f, shells) }}
}

// fit fits a form to the data. With form "" a β model is taken for fewer than
// eight bins and a modified β model for more. The modified β model gets its
// second component only where one does not fit (p < 0.05), and where the second
// lowers χ² by more than 3 ln n, the criterion of Schwarz 1978 for its three
// parameters.
func (d density) fit(form Form) (*Gas, error) {
	if form == "" {
		form = ModifiedBeta
		if d.data.Len() < fewShells {
			form = Beta
		}
	}
	f := newFamily(form, d.shells)
	g, x, err := d.fitFamily(f)
	if err != nil {
		return nil, err
	}
	if form == ModifiedBeta && g.Dof > 3 && infer.ChiSquareP(g.Chi2, g.Dof) < secondComponent {
		two, _, err := d.fitFamily(newFamily(form, d.shells).second(x[:len(f.fitted)], d.shells))
		if err == nil && g.Chi2-two.Chi2 > 3*math.Log(float64(d.data.Len())) {
			return two, nil
		}
	}
	return g, nil
}

// fitFamily fits the family to the data by least squares, from each of its
// starts, and takes the errors from the curvature at the best.
func (d density) fitFamily(f *family) (*Gas, []float64, error) {
	f = d.withBackground(f)
	s := &formFit{f, d.data, d.predict(f.form)}
	best, least, settled := []float64(nil), math.Inf(1), false
	for _, start := range f.starts {
		if x, sum, ok := leastSquares(s.residuals, s.size(), start); sum < least {
			best, least, settled = x, sum, ok
		}
	}
	if best == nil {
		return nil, nil, fmt.Errorf("%s cannot be fitted to these %s", f.words, d.words)
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
	r, n := make([]float64, s.size()), d.data.Len()
	s.residuals(best, r)
	g := &Gas{
		Form: f.form, Parameters: f.parameters(best), Words: fmt.Sprintf("%s fitted to %d %s", f.words, n, d.words),
		Inner: d.data.Inner[0], Outer: d.data.Outer[n-1],
		Chi2: floats.Dot(r[:n], r[:n]), Dof: max(n-len(best), 0), Fitted: true, Notes: d.data.Notes,
	}
	own := len(f.form.parameters()) // without the background
	g.Parameters = g.Parameters[:own]
	for k := range best {
		move := make([]float64, len(f.base))
		for i, c := range f.fitted {
			move[c.index] = inverse.At(i, k) * c.derivative(best[i])
		}
		g.Moves = append(g.Moves, move[:own])
	}
	if !settled {
		g.Notes = append(g.Notes, "the fit of the density did not settle on one minimum")
	}
	return g, best, nil
}

// withBackground adds the background behind the form's parameters.
func (d density) withBackground(f *family) *family {
	with := *f
	with.base = append(append([]float64(nil), f.base...), d.background.mean)
	if d.background.sd == 0 {
		return &with
	}
	c := d.background
	c.index = len(f.base)
	with.fitted = append(append([]coordinate(nil), f.fitted...), c)
	with.starts = nil
	for _, x := range f.starts {
		with.starts = append(with.starts, append(append([]float64(nil), x...), c.mean))
	}
	return &with
}
