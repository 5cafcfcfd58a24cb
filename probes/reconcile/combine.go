package reconcile

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// Linear is a weighted mean of correlated measurements of one quantity.
type Linear struct {
	Mean    float64
	SD      float64   // standard error of Mean
	Weights []float64 // add up to one; a correlation can make one negative
	Chi2    float64   // of the measurements about Mean, n − 1 degrees of freedom
	Scatter float64   // τ, the standard deviation allowed for beyond the covariance
}

// BestLinear is the unbiased weighted mean of x with the least variance
// (Aitken 1935; Lyons, Gibaut & Clifford 1988 for its use on measurements):
//
//	w = C⁻¹1 / (1ᵀC⁻¹1),   x̄ = wᵀx,   SD² = 1/(1ᵀC⁻¹1),   χ² = (x − x̄)ᵀC⁻¹(x − x̄)
//
// C is the covariance of x, any unit. Where two measurements are correlated by
// more than the ratio of their errors the worse has a negative weight, and the
// mean may lie outside both.
func BestLinear(x []float64, c mat.Symmetric) (Linear, error) {
	n := len(x)
	if c.SymmetricDim() != n || n == 0 {
		return Linear{}, fmt.Errorf("%d measurements with a covariance of %d", n, c.SymmetricDim())
	}
	var chol mat.Cholesky
	if !chol.Factorize(c) {
		return Linear{}, errors.New("the covariance of the masses is not positive definite: two of them move as one, or one has no error")
	}
	ones := mat.NewVecDense(n, nil)
	for i := range n {
		ones.SetVec(i, 1)
	}
	var w, solved mat.VecDense
	if err := chol.SolveVecTo(&w, ones); err != nil {
		return Linear{}, fmt.Errorf("the covariance of the masses is nearly singular: %w", err)
	}
	total := mat.Dot(&w, ones)
	w.ScaleVec(1/total, &w)
	residual := mat.NewVecDense(n, append([]float64(nil), x...))
	mean := mat.Dot(&w, residual)
	residual.AddScaledVec(residual, -mean, ones)
	if err := chol.SolveVecTo(&solved, residual); err != nil {
		return Linear{}, fmt.Errorf("the covariance of the masses is nearly singular: %w", err)
	}
	return Linear{Mean: mean, SD: math.Sqrt(1 / total), Weights: w.RawVector().Data, Chi2: mat.Dot(&solved, residual)}, nil
}

// RandomEffects is the best linear mean of measurements that scatter about it
// by τ beyond their covariance, C + τ²I, with the τ for which χ² equals its
// expectation, n − 1 (Paule & Mandel 1982, generalised to correlated
// measurements; for independent ones the estimator of DerSimonian & Laird 1986
// takes one step towards the same τ). τ is 0 when χ² is below n − 1 already,
// and the mean is then the BestLinear one.
func RandomEffects(x []float64, c mat.Symmetric) (Linear, error) {
	fixed, err := BestLinear(x, c)
	dof := float64(len(x) - 1)
	if err != nil || fixed.Chi2 <= dof {
		return fixed, err
	}
	with := func(tau2 float64) (Linear, error) {
		wide := mat.NewSymDense(len(x), nil)
		wide.CopySym(c)
		for i := range x {
			wide.SetSym(i, i, c.At(i, i)+tau2)
		}
		return BestLinear(x, wide)
	}
	// χ² falls with τ², as residuals²/τ² in the end.
	lo, hi := 0.0, c.At(0, 0)
	for range 200 {
		at, err := with(hi)
		if err != nil {
			return Linear{}, err
		}
		if at.Chi2 < dof {
			break
		}
		lo, hi = hi, 2*hi
	}
	var best Linear
	for hi-lo > 1e-14*hi {
		mid := (lo + hi) / 2
		if best, err = with(mid); err != nil {
			return Linear{}, err
		}
		best.Scatter = math.Sqrt(mid)
		if best.Chi2 > dof {
			lo = mid
		} else {
			hi = mid
		}
	}
	return best, nil
}
