package lensing

import (
	"math"
)

// measure compares a model with the shear of a profile. The errors of the bins
// stand alone, or together with a covariance of their own or of structure along
// the line of sight.
type measure struct {
	bins  []Bin
	given []float64 // covariance that takes the place of the errors; nil for none
	added []float64 // covariance beside them; nil for none
	c, d  []float64 // scratch
}

func newMeasure(p *Profile, added []float64) *measure {
	n := len(p.Bins)
	return &measure{bins: p.Bins, given: p.Covariance, added: added, c: make([]float64, n*n), d: make([]float64, n)}
}

// copy returns a measure for another goroutine.
func (m *measure) copy() *measure {
	return newMeasure(&Profile{Bins: m.bins, Covariance: m.given}, m.added)
}

// compare returns the log likelihood and χ² of the expected shears. Of two
// errors the upper one holds where the model lies above the datum. Each of
// modes is a change of all shears together, by one standard deviation of what
// it stands for: its outer product adds to the covariance.
func (m *measure) compare(expected []float64, modes ...[]float64) (lnLikelihood, chi2 float64) {
	n := len(m.bins)
	lnLikelihood = -float64(n) * math.Log(2*math.Pi) / 2
	for i := range m.bins {
		b := &m.bins[i]
		d := expected[i] - b.Shear
		sigma := b.Minus
		if d > 0 {
			sigma = b.Plus
		}
		// The two halves share one norm; the determinant below has that of a side.
		lnLikelihood -= math.Log(b.Error() / sigma)
		m.d[i], m.c[i*n+i] = d, sigma*sigma
	}
	if m.given == nil && m.added == nil && len(modes) == 0 {
		for i, d := range m.d {
			sigma2 := m.c[i*n+i]
			chi2 += d * d / sigma2
			lnLikelihood -= math.Log(sigma2) / 2
		}
		return lnLikelihood - chi2/2, chi2
	}
	for i := range n {
		for j := range i + 1 {
			v := 0.0
			switch {
			case m.given != nil:
				v = m.given[i*n+j]
			case i == j:
				v = m.c[i*n+i]
			}
			if m.added != nil {
				v += m.added[i*n+j]
			}
			for _, mode := range modes {
				v += mode[i] * mode[j]
			}
			m.c[i*n+j] = v
		}
	}
	lnRoot, chi2 := whiten(m.c, m.d)
	return lnLikelihood - lnRoot - chi2/2, chi2
}

// whiten factorises the positive definite matrix c, of which it reads and
// overwrites the lower triangle, by Cholesky, and solves for d in place. It
// returns half the log determinant and dᵀ c⁻¹ d, which is infinite when the
// matrix is not positive definite.
func whiten(c, d []float64) (lnRoot, chi2 float64) {
	n := len(d)
	for i := range n {
		row := c[i*n : i*n+i+1]
		for j := range row {
			other := c[j*n : j*n+j+1]
			v := row[j]
			for k := range j {
				v -= row[k] * other[k]
			}
			if j < i {
				row[j] = v / other[j]
				continue
			}
			if !(v > 0) {
				return 0, math.Inf(1)
			}
			row[i] = math.Sqrt(v)
		}
		for k := range i {
			d[i] -= row[k] * d[k]
		}
		d[i] /= row[i]
		lnRoot += math.Log(row[i])
		chi2 += d[i] * d[i]
	}
	return lnRoot, chi2
}
