package reconcile

import (
	"errors"
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

// polynomial is the basis of all monomials up to a degree in d standardised
// variables.
type polynomial struct {
	mean, sd []float64
	powers   [][]int // one row a monomial: the power of each variable
	degree   int
}

func newPolynomial(rows [][]float64, degree int) *polynomial {
	mean, cov := moments(rows)
	c := &polynomial{mean: mean, sd: make([]float64, len(mean)), degree: degree}
	for j := range c.sd {
		c.sd[j] = math.Sqrt(cov.At(j, j))
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

// design evaluates every monomial at every row.
func (c *polynomial) design(rows [][]float64) *mat.Dense {
	out := mat.NewDense(len(rows), len(c.powers), nil)
	table := make([][]float64, len(c.mean)) // table[j][k] = u_j^k
	for j := range table {
		table[j] = make([]float64, c.degree+1)
		table[j][0] = 1
	}
	for i, x := range rows {
		for j, v := range x {
			u := (v - c.mean[j]) / c.sd[j]
			for k := range c.degree {
				table[j][k+1] = table[j][k] * u
			}
		}
		row := out.RawRowView(i)
		for t, power := range c.powers {
			v := 1.0
			for j, k := range power {
				v *= table[j][k]
			}
			row[t] = v
		}
	}
	return out
}

// leastSquares is the factorised normal matrix of a regression.
type leastSquares struct{ chol mat.Cholesky }

func newLeastSquares(design *mat.Dense) (*leastSquares, error) {
	n, terms := design.Dims()
	gram := make([]float64, terms*terms)
	for i := range n {
		row := design.RawRowView(i)
		for a, v := range row {
			for b := a; b < terms; b++ {
				gram[a*terms+b] += v * row[b]
			}
		}
	}
	for a := range terms {
		// A ridge far below the data's own weight keeps a near-degenerate
		// monomial from failing the solution; it moves a coefficient by 1e-10.
		gram[a*terms+a] *= 1 + 1e-10
	}
	f := new(leastSquares)
	if !f.chol.Factorize(mat.NewSymDense(terms, gram)) {
		return nil, errors.New("the regression of the masses on the shared nuisances is singular")
	}
	return f, nil
}

// solve regresses y on the design the matrix was made from.
func (f *leastSquares) solve(design *mat.Dense, y []float64) []float64 {
	_, terms := design.Dims()
	right, coef := mat.NewVecDense(terms, nil), mat.NewVecDense(terms, nil)
	sum := right.RawVector().Data
	for i, v := range y {
		for t, d := range design.RawRowView(i) {
			sum[t] += d * v
		}
	}
	// The factorisation passed with the ridge, so its condition is bounded.
	_ = f.chol.SolveVecTo(coef, right)
	return coef.RawVector().Data
}
