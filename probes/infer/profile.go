package infer

import (
	"math"
	"sort"
)

// Parameter returns the column of that name among the parameters and then the
// nuisances, or nil when there is none.
func (d *Draws) Parameter(name string) *Parameter {
	for _, set := range [][]Parameter{d.Parameters, d.Nuisances} {
		for i := range set {
			if set[i].Name == name {
				return &set[i]
			}
		}
	}
	return nil
}

// LnMassAt returns ln M(<r) of draw i, M in Msun, at ln r, r in kpc: the cubic
// through the four nearest points of the grid in ln r (the two on each side,
// at an end of the grid the last four). On Grid an NFW profile is reproduced to
// better than 1e-5. Outside the grid, where nothing is known, it is NaN.
func (d *Draws) LnMassAt(i int, lnR float64) float64 {
	first, w, ok := d.cubic(lnR)
	if !ok {
		return math.NaN()
	}
	return d.blend(i, first, w)
}

// LnMassesAt returns LnMassAt of every draw, and false when r is outside the
// grid.
func (d *Draws) LnMassesAt(lnR float64) ([]float64, bool) {
	first, w, ok := d.cubic(lnR)
	if !ok {
		return nil, false
	}
	out := make([]float64, d.N)
	for i := range out {
		out[i] = d.blend(i, first, w)
	}
	return out, true
}

// gridSlack is how far outside the grid, in ln r, a radius is still taken for
// its end: the rounding of a logarithm.
const gridSlack = 1e-9

// cubic returns the index of the first of up to four grid points and the
// Lagrange weights with which they give the value at lnR.
func (d *Draws) cubic(lnR float64) (first int, w []float64, ok bool) {
	n := len(d.Radii)
	if n == 0 || !(lnR >= math.Log(d.Radii[0])-gridSlack) || !(lnR <= math.Log(d.Radii[n-1])+gridSlack) {
		return 0, nil, false
	}
	above := sort.Search(n, func(j int) bool { return math.Log(d.Radii[j]) > lnR })
	size := min(4, n)
	first = min(max(above-2, 0), n-size)
	x := make([]float64, size)
	for j := range x {
		x[j] = math.Log(d.Radii[first+j])
	}
	w = make([]float64, size)
	for j := range w {
		w[j] = 1
		for k := range x {
			if k != j {
				w[j] *= (lnR - x[k]) / (x[j] - x[k])
			}
		}
	}
	return first, w, true
}

func (d *Draws) blend(i, first int, w []float64) float64 {
	row := d.LnMass[i*len(d.Radii)+first:]
	sum := 0.0
	for j, v := range w {
		sum += v * row[j]
	}
	return sum
}

// RadiusAt returns the radius in kpc within which the mean density of draw i is
// threshold, in Msun/kpc³:
//
//	M(<r) = 4π/3 · threshold · r³,
//
// on the interpolated profile of LnMassAt. Where a profile crosses the threshold
// several times it is the innermost radius at which the mean density falls
// through it. ok is false when the mean density is below the threshold already
// at the innermost radius of the grid, or still above it at the outermost.
func (d *Draws) RadiusAt(i int, threshold float64) (r float64, ok bool) {
	n := len(d.Radii)
	if n == 0 || !(threshold > 0) {
		return 0, false
	}
	lnRho := math.Log(4 * math.Pi / 3 * threshold)
	row := d.LnMass[i*n : (i+1)*n]
	excess := func(j int) float64 { return row[j] - 3*math.Log(d.Radii[j]) - lnRho }
	if excess(0) < 0 {
		return 0, false
	}
	j := 1
	for j < n && excess(j) > 0 {
		j++
	}
	if j == n {
		return d.Radii[n-1], excess(n-1) == 0
	}
	lo, hi := math.Log(d.Radii[j-1]), math.Log(d.Radii[j])
	above, below := excess(j-1), excess(j)
	// False position, the end that stays put halved (Dowell & Jarratt 1971): a
	// nearly straight function is solved to rounding in a handful of steps.
	side := 0
	for range 60 {
		x := (lo*below - hi*above) / (below - above)
		f := d.LnMassAt(i, x) - 3*x - lnRho
		switch {
		case f == 0 || hi-lo < 1e-14:
			return math.Exp(x), true
		case f > 0:
			if lo, above = x, f; side > 0 {
				below /= 2
			}
			side = 1
		default:
			if hi, below = x, f; side < 0 {
				above /= 2
			}
			side = -1
		}
		if math.Abs(f) < 1e-14 {
			return math.Exp(x), true
		}
	}
	return math.Exp((lo + hi) / 2), true
}
