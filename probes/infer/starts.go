package infer

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"strings"

	"gonum.org/v1/gonum/mathext"
)

const (
	fewStarts  = 64
	mostStarts = 32768
)

// starts returns n points that fill the prior evenly: the additive recurrence
// u_ij = frac(v_j + i·√p_j) with p_j the primes (Niederreiter 1992, section
// 3.1), shifted by random v, in prior scores.
func starts(n, dim int, rng *rand.Rand) [][]float64 {
	shift := make([]float64, dim)
	for j := range shift {
		shift[j] = rng.Float64()
	}
	roots := primeRoots(dim)
	z := rows(n, dim)
	for i := range z {
		for j := range z[i] {
			u := shift[j] + float64(float64(i)*roots[j])
			u -= math.Floor(u)
			z[i][j] = mathext.NormalQuantile(min(max(u, 1e-9), 1-1e-9))
		}
	}
	return z
}

// primeRoots returns the square roots of the first n primes.
func primeRoots(n int) []float64 {
	var primes []int
	for c := 2; len(primes) < n; c++ {
		prime := true
		for _, p := range primes {
			if c%p == 0 {
				prime = false
				break
			}
		}
		if prime {
			primes = append(primes, c)
		}
	}
	out := make([]float64, n)
	for i, p := range primes {
		out[i] = math.Sqrt(float64(p))
	}
	return out
}

// survey scores points spread over the prior, more of them while none is
// possible, and fails when even thousands find no possible model.
func survey(ctx context.Context, t *target, rng *rand.Rand) (z [][]float64, logp []float64, err error) {
	for n := fewStarts; n <= mostStarts; n *= 8 {
		z = starts(n, t.dim, rng)
		if logp, err = t.evaluate(ctx, z); err != nil {
			return nil, nil, err
		}
		possible := 0
		for _, l := range logp {
			if !math.IsInf(l, -1) {
				possible++
			}
		}
		if possible > 0 {
			return z, logp, nil
		}
	}
	priors := make([]string, t.dim)
	for j, f := range t.free {
		priors[j] = fmt.Sprintf("%s ~ %v", f.Name, f.Prior)
	}
	return nil, nil, fmt.Errorf("infer: the prior excludes the data: of %d sets of parameters spread over the prior (%s) none is possible; widen a prior or check the data",
		t.spent, strings.Join(priors, ", "))
}
