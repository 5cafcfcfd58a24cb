package reconcile

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"

	"steelyard/probes/infer"
)

// carrier reads one estimate at the joint draws: its stored draws in the joint
// order, carried from their own scores to the joint ones by the regression of
// what is read on the scores.
type carrier struct {
	draws *infer.Draws
	order []int
	fit   *leastSquares // on the stored scores; nil when nothing is shared
	from  *mat.Dense    // terms of the stored scores
	to    *mat.Dense    // terms of the joint scores, brought into the range of the stored ones
	// Where joint scores lie beyond the stored ones a straight line takes over.
	line       *leastSquares // nil where none do
	lineFrom   *mat.Dense
	lineBeyond *mat.Dense // difference of the line's terms
}

// newCarrier prepares estimate k. The degree of the regression is chosen where
// its data lie.
func (j *Joint) newCarrier(k int, e Estimate) (*carrier, error) {
	c := &carrier{draws: e.Draws, order: j.Order[k]}
	p, err := scoresOf(e, j.Nuisances)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", e.Name, err)
	}
	if len(p.names) == 0 {
		return c, nil
	}
	joint, inside := make([][]float64, j.N), make([][]float64, j.N)
	lo, hi := bounds(p.scores)
	for i := range joint {
		joint[i] = pick(j.Scores[i], p.names)
		inside[i] = slices.Clone(joint[i])
		for n, s := range joint[i] {
			inside[i][n] = min(max(s, lo[n]), hi[n])
		}
	}
	typical, err := c.stored(math.Sqrt(e.Draws.Covers[0] * e.Draws.Covers[1]))
	if err != nil {
		return nil, fmt.Errorf("%s: %w", e.Name, err)
	}
	// A cubic in one variable would miss 3% of the spread that a uniform
	// non-thermal fraction gives to ln M; a quintic where a line will do is noise
	// wherever the scores are moved to.
	degrees := []int{1, 2, 3, 5}
	if len(p.names) > 2 {
		degrees = degrees[:3]
	}
	basis, err := choose(p.scores, typical, degrees...)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", e.Name, err)
	}
	c.from, c.to = basis.design(p.scores), basis.design(inside)
	if c.fit, err = newLeastSquares(c.from); err != nil {
		return nil, fmt.Errorf("%s: %w", e.Name, err)
	}
	if slices.EqualFunc(joint, inside, slices.Equal[[]float64]) {
		return c, nil
	}
	line := newPolynomial(p.scores, 1)
	c.lineFrom, c.lineBeyond = line.design(p.scores), line.design(joint)
	c.lineBeyond.Sub(c.lineBeyond, line.design(inside))
	if c.line, err = newLeastSquares(c.lineFrom); err != nil {
		return nil, fmt.Errorf("%s: %w", e.Name, err)
	}
	return c, nil
}

// bounds is the range of each column.
func bounds(rows [][]float64) (lo, hi []float64) {
	lo, hi = slices.Clone(rows[0]), slices.Clone(rows[0])
	for _, x := range rows {
		for c, v := range x {
			lo[c], hi[c] = min(lo[c], v), max(hi[c], v)
		}
	}
	return lo, hi
}

// stored is ln M(<r) of the stored draws.
func (c *carrier) stored(r float64) ([]float64, error) {
	all, ok := c.draws.LnMassesAt(math.Log(r))
	if !ok {
		return nil, fmt.Errorf("%.4g kpc is outside the grid of radii, %.4g to %.4g kpc", r, c.draws.Radii[0], c.draws.Radii[len(c.draws.Radii)-1])
	}
	return all, nil
}

// carry brings y, a quantity of the stored draws, to the joint draws. common is
// the part of the result that the shared nuisances carry, nil when there are
// none.
func (c *carrier) carry(y []float64) (moved, common []float64) {
	if c.fit == nil {
		return pick(y, c.order), nil
	}
	coef := c.fit.solve(c.from, y)
	common = product(c.to, coef)
	if c.line != nil {
		for i, v := range product(c.lineBeyond, c.line.solve(c.lineFrom, y)) {
			common[i] += v
		}
	}
	moved = pick(minus(y, product(c.from, coef)), c.order)
	for i, v := range common {
		moved[i] += v
	}
	return moved, common
}

// pick is the listed items of x.
func pick(x []float64, which []int) []float64 {
	out := make([]float64, len(which))
	for i, k := range which {
		out[i] = x[k]
	}
	return out
}

// product is the value of a polynomial at every row of its design.
func product(design *mat.Dense, coef []float64) []float64 {
	n, _ := design.Dims()
	out := make([]float64, n)
	for i := range out {
		for t, f := range design.RawRowView(i) {
			out[i] += f * coef[t]
		}
	}
	return out
}

// at is ln M(<r) of the joint draws, and the part the shared nuisances carry.
func (c *carrier) at(r float64) (ln, common []float64, err error) {
	y, err := c.stored(r)
	if err != nil {
		return nil, nil, err
	}
	ln, common = c.carry(y)
	return ln, common, nil
}

// commonPart is the regression of y, a quantity of the joint draws, on the joint
// scores; nil when nothing is shared.
func (c *carrier) commonPart(y []float64) ([]float64, error) {
	if c.fit == nil {
		return nil, nil
	}
	fit, err := newLeastSquares(c.to)
	if err != nil {
		return nil, err
	}
	return product(c.to, fit.solve(c.to, y)), nil
}

// profile is the whole profile of the joint draws on the estimate's own grid.
func (c *carrier) profile() *infer.Draws {
	width := len(c.draws.Radii)
	d := &infer.Draws{N: len(c.order), Radii: c.draws.Radii, Covers: c.draws.Covers, LnMass: make([]float64, len(c.order)*width)}
	y := make([]float64, c.draws.N)
	for r := range width {
		for i := range y {
			y[i] = c.draws.LnMass[i*width+r]
		}
		moved, _ := c.carry(y)
		for i, v := range moved {
			d.LnMass[i*width+r] = v
		}
	}
	return d
}
