package lensing

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"

	"steelyard/probes/catalogue"
)

// readCovariance reads the covariance of the bins and puts the errors that it
// implies in the place of the profile's.
func readCovariance(table *catalogue.Table, p *Profile) error {
	n := len(p.Bins)
	read := readMatrix
	if table.Column("first") != nil {
		read = readPairs
	}
	c, err := read(table, n)
	if err != nil {
		return err
	}
	var eigen mat.EigenSym
	if !eigen.Factorize(mat.NewSymDense(n, c), false) {
		return fmt.Errorf("%s: the covariance has no eigenvalues", table.File)
	}
	if lowest := eigen.Values(nil)[0]; !(lowest > 0) {
		return fmt.Errorf("%s: the covariance is not positive definite: its lowest eigenvalue is %.4g", table.File, lowest)
	}
	p.Covariance = c
	for i := range p.Bins {
		sigma := math.Sqrt(c[i*n+i])
		p.Bins[i].Minus, p.Bins[i].Plus = sigma, sigma
	}
	return nil
}

// readPairs reads a covariance of one row a pair of bins.
func readPairs(table *catalogue.Table, n int) ([]float64, error) {
	first, second, value := table.Values("first"), table.Values("second"), table.Values("value")
	c, given := make([]float64, n*n), make([]bool, n*n)
	for k := range value {
		i, j := int(first[k])-1, int(second[k])-1
		if float64(i+1) != first[k] || float64(j+1) != second[k] || i < 0 || j < 0 || i >= n || j >= n {
			return nil, fmt.Errorf("%s, row %d: bins %g and %g, where the profile has bins 1 to %d", table.File, table.Rows[k], first[k], second[k], n)
		}
		if given[i*n+j] && c[i*n+j] != value[k] {
			return nil, fmt.Errorf("%s, row %d: bins %d and %d have another covariance in an earlier row", table.File, table.Rows[k], i+1, j+1)
		}
		c[i*n+j], c[j*n+i] = value[k], value[k]
		given[i*n+j], given[j*n+i] = true, true
	}
	return c, nil
}

// readMatrix reads a covariance of one row and one column a bin.
func readMatrix(table *catalogue.Table, n int) ([]float64, error) {
	if table.Len() != n || len(table.Columns) != n {
		return nil, fmt.Errorf("%s: %d rows of %d columns, where the covariance of %d bins has as many of each", table.File, table.Len(), len(table.Columns), n)
	}
	c := make([]float64, n*n)
	for j := range table.Columns {
		for i, v := range table.Columns[j].Values {
			c[i*n+j] = v
		}
	}
	for i := range n {
		for j := range i {
			a, b := c[i*n+j], c[j*n+i]
			if math.Abs(a-b) > 1e-6*(math.Abs(a)+math.Abs(b)) { // quoted rounded
				return nil, fmt.Errorf("%s, row %d: bins %d and %d have a covariance of %g, the other way round of %g", table.File, table.Rows[i], i+1, j+1, a, b)
			}
			c[i*n+j], c[j*n+i] = (a+b)/2, (a+b)/2
		}
	}
	return c, nil
}
