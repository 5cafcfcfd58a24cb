package reconcile

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// moments returns the mean and the covariance (divisor N) of rows.
func moments(rows [][]float64) ([]float64, *mat.SymDense) {
	d := len(rows[0])
	mean, cov := make([]float64, d), mat.NewSymDense(d, nil)
	for _, x := range rows {
		for a, v := range x {
			mean[a] += v
		}
	}
	for a := range mean {
		mean[a] /= float64(len(rows))
	}
	sum := make([]float64, d*d)
	for _, x := range rows {
		for a := range d {
			for b := a; b < d; b++ {
				sum[a*d+b] += (x[a] - mean[a]) * (x[b] - mean[b])
			}
		}
	}
	for a := range d {
		for b := a; b < d; b++ {
			cov.SetSym(a, b, sum[a*d+b]/float64(len(rows)))
		}
	}
	return mean, cov
}

// polynomial is the basis of all monomials in d standardised variables, up to
// fifth degree for one or two variables and third beyond. A cubic in one
// variable would miss 3% of the spread that a uniform non-thermal fraction gives
// to ln M.
type polynomial struct {
	mean, sd []float64
	powers   [][]int // one row a monomial: the power of each variable
}

func newPolynomial(rows [][]float64) polynomial {
	mean, cov := moments(rows)
	c := polynomial{mean: mean, sd: make([]float64, len(mean))}
	for j := range c.sd {
		c.sd[j] = math.Sqrt(cov.At(j, j))
	}
	degree := 5
	if len(mean) > 2 {
		degree = 3
	}
	c.enumerate(make([]int, len(mean)), 0, degree)
	return c
}

func (c *polynomial) enumerate(power []int, from, left int) {
	if from == len(power) {
		c.powers = append(c.powers, append([]int(nil), power...))
		return
	}
	for k := 0; k <= left; k++ {
		power[from] = k
		c.enumerate(power, from+1, left-k)
	}
	power[from] = 0
}

func (c *polynomial) terms(x, out []float64) {
	for t, power := range c.powers {
		v := 1.0
		for j, k := range power {
			u := (x[j] - c.mean[j]) / c.sd[j]
			for range k {
				v *= u
			}
		}
		out[t] = v
	}
}

// regression is a fitted polynomial of several responses at once.
type regression struct {
	basis *polynomial
	coef  *mat.Dense // terms × responses
	term  []float64  // scratch
}

// fit regresses y (len(rows) × width, row-major) on rows by least squares.
func (c *polynomial) fit(rows [][]float64, y []float64, width int) (*regression, error) {
	terms := len(c.powers)
	normal, right := mat.NewSymDense(terms, nil), mat.NewDense(terms, width, nil)
	term := make([]float64, terms)
	gram := make([]float64, terms*terms)
	raw := right.RawMatrix().Data
	for i, x := range rows {
		c.terms(x, term)
		for a, ta := range term {
			for b := a; b < terms; b++ {
				gram[a*terms+b] += ta * term[b]
			}
			row := raw[a*width : (a+1)*width]
			for w, v := range y[i*width : (i+1)*width] {
				row[w] += ta * v
			}
		}
	}
	for a := range terms {
		for b := a; b < terms; b++ {
			normal.SetSym(a, b, gram[a*terms+b])
		}
		// A ridge far below the data's own weight keeps a near-degenerate
		// monomial from failing the solution; it moves a coefficient by 1e-10.
		normal.SetSym(a, a, gram[a*terms+a]*(1+1e-10))
	}
	var chol mat.Cholesky
	if !chol.Factorize(normal) {
		return nil, errors.New("the regression of the masses on the shared nuisances is singular")
	}
	coef := mat.NewDense(terms, width, nil)
	if err := chol.SolveTo(coef, right); err != nil {
		return nil, fmt.Errorf("the regression of the masses on the shared nuisances is nearly singular: %w", err)
	}
	return &regression{basis: c, coef: coef, term: term}, nil
}

// at evaluates the fitted responses at x.
func (r *regression) at(x, out []float64) {
	r.basis.terms(x, r.term)
	clear(out)
	for t, v := range r.term {
		for w, c := range r.coef.RawRowView(t) {
			out[w] += v * c
		}
	}
}
