package xray

import (
	"math"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"
)

// leastSquares minimises ½ Σ r² over x by the method of Levenberg 1944 and
// Marquardt 1963, from the given start. It returns the minimum, Σ r² there, and
// whether it settled: the next step would gain less than 1e-6.
func leastSquares(residuals func(x, out []float64), size int, start []float64) (x []float64, sum float64, settled bool) {
	d := len(start)
	x = append([]float64(nil), start...)
	r, trial, next := make([]float64, size), make([]float64, size), make([]float64, d)
	residuals(x, r)
	sum = floats.Dot(r, r)
	damping := 1e-2
	damped, step := mat.NewSymDense(d, nil), mat.NewVecDense(d, nil)
	for range 200 {
		j := slopesAt(residuals, x, r)
		var normal mat.SymDense
		normal.SymOuterK(1, j.T())
		var slope mat.VecDense
		slope.MulVec(j.T(), mat.NewVecDense(size, r))
		for {
			damped.CopySym(&normal)
			for i := range d {
				damped.SetSym(i, i, normal.At(i, i)*(1+damping))
			}
			var chol mat.Cholesky
			if !chol.Factorize(damped) || chol.SolveVecTo(step, &slope) != nil {
				damping *= 10
				if damping > 1e12 {
					return x, sum, false
				}
				continue
			}
			promised := mat.Dot(step, &slope)
			for i := range d {
				// A parameter moves by at most two at a time: the coordinates are
				// logarithms, and the linear model knows nothing farther off.
				next[i] = x[i] - math.Max(-2, math.Min(2, step.AtVec(i)))
			}
			residuals(next, trial)
			if better := floats.Dot(trial, trial); better < sum {
				gained := sum - better
				copy(x, next)
				copy(r, trial)
				sum = better
				damping = math.Max(damping/10, 1e-12)
				if gained < 1e-6 && promised < 1e-6 {
					return x, sum, true
				}
				break
			}
			if promised < 1e-6 {
				return x, sum, true
			}
			if damping *= 10; damping > 1e12 {
				return x, sum, false
			}
		}
	}
	return x, sum, false
}

// slopesAt is ∂residual/∂x at x, where the residuals are r, by one-sided
// differences: good enough to find the way, at half the price.
func slopesAt(residuals func(x, out []float64), x, r []float64) *mat.Dense {
	const h = 1e-6 // the coordinates are of order one, and so is the curvature
	j := mat.NewDense(len(r), len(x), nil)
	out, at := make([]float64, len(r)), append([]float64(nil), x...)
	for i := range x {
		at[i] = x[i] + h
		residuals(at, out)
		at[i] = x[i]
		for k := range out {
			j.Set(k, i, (out[k]-r[k])/h)
		}
	}
	return j
}

// jacobian is ∂residual/∂x by central differences.
func jacobian(residuals func(x, out []float64), x []float64, size int) *mat.Dense {
	const h = 1e-4 // the coordinates are of order one: errs by h² of a third derivative
	j := mat.NewDense(size, len(x), nil)
	up, down, at := make([]float64, size), make([]float64, size), append([]float64(nil), x...)
	for i := range x {
		at[i] = x[i] + h
		residuals(at, up)
		at[i] = x[i] - h
		residuals(at, down)
		at[i] = x[i]
		for k := range up {
			j.Set(k, i, (up[k]-down[k])/(2*h))
		}
	}
	return j
}
