package lensing

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/interp"

	"steelyard/probes/cosmology"
)

// fluctuations states how lumpy the matter of a background is.
type fluctuations struct {
	sigma8  float64 // rms of the linear density in spheres of 8/h Mpc today
	index   float64 // n_s
	baryons float64 // Ω_b today
}

// spectrum is the power spectrum of matter, linear and non-linear, of one
// background. Wavenumbers are comoving and in 1/Mpc, without h; powers are in
// Mpc³. It is not safe for concurrent use.
type spectrum struct {
	background *cosmology.Cosmology
	params     fluctuations
	h          float64
	linear     interp.NaturalCubic // ln P(k) today over ln k
	nonlinear  map[float64]halofit // by redshift; looked up, never ranged over
}

// The table of the linear spectrum reaches from smallest to largest, 1/Mpc.
const smallest, largest, tableSteps = 1e-5, 1e4, 2000

// newSpectrum prepares a spectrum, normalised to sigma8.
func newSpectrum(c *cosmology.Cosmology, p fluctuations) (*spectrum, error) {
	q := c.Params()
	switch {
	case !(p.sigma8 > 0 && p.sigma8 < 3):
		return nil, fmt.Errorf("sigma_8 = %g", p.sigma8)
	case !(p.index > 0.5 && p.index < 1.5):
		return nil, fmt.Errorf("spectral index %g", p.index)
	case !(p.baryons > 0 && p.baryons < q.OmegaMatter):
		return nil, fmt.Errorf("baryons of Ω = %g, where all matter has %g", p.baryons, q.OmegaMatter)
	}
	s := &spectrum{background: c, params: p, h: q.HubbleConstant / 100, nonlinear: map[float64]halofit{}}
	t := newTransfer(q.OmegaMatter*s.h*s.h, p.baryons*s.h*s.h)
	lnK, lnP := make([]float64, tableSteps+1), make([]float64, tableSteps+1)
	for i := range lnK {
		lnK[i] = math.Log(smallest) + math.Log(largest/smallest)*float64(i)/tableSteps
		k := math.Exp(lnK[i])
		lnP[i] = p.index*lnK[i] + 2*math.Log(t.at(k))
	}
	if err := s.linear.Fit(lnK, lnP); err != nil {
		return nil, fmt.Errorf("%w", err)
	}
	amplitude := 2 * math.Log(p.sigma8/s.topHat(8/s.h))
	for i := range lnP {
		lnP[i] += amplitude
	}
	if err := s.linear.Fit(lnK, lnP); err != nil {
		return nil, fmt.Errorf("%w", err)
	}
	return s, nil
}

// today is the linear power at redshift 0.
func (s *spectrum) today(k float64) float64 {
	lnK := math.Log(k)
	switch lo, hi := math.Log(smallest), math.Log(largest); {
	case lnK < lo:
		return math.Exp(s.linear.Predict(lo) + s.params.index*(lnK-lo))
	case lnK > hi: // where k^(n−4) ln² k is falling off
		return math.Exp(s.linear.Predict(hi) + s.linear.PredictDerivative(hi)*(lnK-hi))
	}
	return math.Exp(s.linear.Predict(lnK))
}

// topHat is the rms of today's linear density in spheres of radius R Mpc.
func (s *spectrum) topHat(R float64) float64 {
	sum := 0.0
	const step = 0.01
	for lnK := math.Log(smallest); lnK < math.Log(100/R); lnK += step {
		k := math.Exp(lnK)
		x := k * R
		w := 3 * (math.Sin(x) - x*math.Cos(x)) / (x * x * x)
		if x < 0.01 {
			w = 1 - x*x/10
		}
		sum += k * k * k * s.today(k) * w * w * step
	}
	return math.Sqrt(sum / (2 * math.Pi * math.Pi))
}
