package xray

import (
	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"

	"steelyard/probes/infer"
)

// leastInfluence is the smallest effect on the temperatures, in units of their
// errors and summed over the bins in quadrature, for which a direction of the
// density's errors is drawn with the mass. One left out would have widened the
// error of the mass by at most half its square, 2%.
const leastInfluence = 0.2

// layModes lays the directions of the density's errors on the nodes.
func (f *fit) layModes() {
	f.air.modes = nil
	for k := range f.gas.Moves {
		phi := make([]float64, len(f.air.grid.r))
		for j, r := range f.air.grid.r {
			phi[j] = f.gas.Mode(k, r)
		}
		f.air.modes = append(f.air.modes, phi)
	}
	f.moves = len(f.air.modes)
}

// turn replaces the directions of the density's errors by those that move the
// temperatures most, independent of one another, in falling order: the
// singular vectors of the temperatures' response at the best fit. Those with an
// influence are drawn with the rest, so that the temperatures have their say in
// the density too; the others keep the errors that the shells gave them.
func (f *fit) turn(b bestFit) {
	if f.moves == 0 {
		return
	}
	n, s := f.spectra.Len(), f.air.newState()
	theta, first := append([]float64(nil), b.theta...), len(f.parameters.Free)
	scale := f.scale.Of(theta)
	f.predict(s, theta)
	model := append([]float64(nil), s.Bins...)
	scatter := f.scatter.Of(theta)
	if f.scatter.Drawn() {
		scatter = f.spectra.scatterNeeded(model, scale, b.dof)
	}
	response := mat.NewDense(n, f.moves, nil)
	up := make([]float64, n)
	for k := range f.moves {
		at := theta[first+k]
		theta[first+k] = at + 0.5
		f.predict(s, theta)
		copy(up, s.Bins)
		theta[first+k] = at - 0.5
		f.predict(s, theta)
		theta[first+k] = at
		for i := range n {
			below, above := f.spectra.sides(i, model[i]/scale, scatter)
			response.Set(i, k, (up[i]-s.Bins[i])/scale/((below+above)/2))
		}
	}
	var svd mat.SVD
	if !svd.Factorize(response, mat.SVDFullV) {
		return // all directions are drawn as they are
	}
	var v mat.Dense
	svd.VTo(&v)
	turned := make([][]float64, f.moves)
	for l := range turned {
		turned[l] = make([]float64, len(f.gas.Parameters))
		for k, old := range f.gas.Moves {
			floats.AddScaled(turned[l], v.At(k, l), old)
		}
	}
	f.gas.Moves = turned
	f.layModes()
	f.moves = 0
	for _, influence := range svd.Values(nil) {
		if influence < leastInfluence {
			break
		}
		f.moves++
	}
}

// drawRest draws the moves along the directions that the temperatures do not
// feel, and appends them to every point.
func (f *fit) drawRest(sample *infer.Sample) {
	rng := f.task.Sampling.Stream.Sub("density").Rand(0)
	for i, theta := range sample.Values {
		for range len(f.air.modes) - f.moves {
			theta = append(theta, rng.NormFloat64())
		}
		sample.Values[i] = theta
	}
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
