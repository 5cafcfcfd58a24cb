package lensing

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// measure compares a model with the shear of a profile.
type measure struct {
	bins []Bin
	// whiten is the inverse of the lower Cholesky factor of the covariance, row
	// by row; nil when the bins are independent.
	whiten  []float64
	logNorm float64 // ln of the likelihood's norm
}

func newMeasure(p *Profile) (*measure, error) {
	m := &measure{bins: p.Bins, logNorm: -float64(len(p.Bins)) * math.Log(2*math.Pi) / 2}
	n := len(p.Bins)
	if p.Covariance == nil {
		for _, b := range p.Bins {
			m.logNorm -= math.Log(b.Error()) // of the two half normals together
		}
		return m, nil
	}
	var chol mat.Cholesky
	if !chol.Factorize(mat.NewSymDense(n, append([]float64(nil), p.Covariance...))) {
		return nil, fmt.Errorf("the covariance of the shears is not positive definite")
	}
	m.logNorm -= chol.LogDet() / 2
	var lower, inverse mat.TriDense
	chol.LTo(&lower)
	if err := inverse.InverseTri(&lower); err != nil {
		return nil, fmt.Errorf("the covariance of the shears cannot be inverted: %w", err)
	}
	m.whiten = make([]float64, n*n)
	for i := range n {
		for j := range i + 1 {
			m.whiten[i*n+j] = inverse.At(i, j)
		}
	}
	return m, nil
}

// chi2 is χ² of the expected shears. Of two errors the upper one holds where
// the model lies above the datum.
func (m *measure) chi2(expected []float64) float64 {
	sum := 0.0
	if m.whiten == nil {
		for i := range m.bins {
			b := &m.bins[i]
			d := (expected[i] - b.Shear)
			if d > 0 {
				d /= b.Plus
			} else {
				d /= b.Minus
			}
			sum += d * d
		}
		return sum
	}
	n := len(m.bins)
	for i := range n {
		d := 0.0
		for j, l := range m.whiten[i*n : i*n+i+1] {
			d += l * (expected[j] - m.bins[j].Shear)
		}
		sum += d * d
	}
	return sum
}
