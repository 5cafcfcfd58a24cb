// Package matter computes the power spectrum of matter, linear and non-linear,
// and what of it lies along the line of sight to distant sources: the noise
// that structure adds to the shear of one object.
//
// Start at New, then Power, Convergence and ShearCovariance. Wavenumbers are
// comoving and in 1/Mpc, without h; powers are in Mpc³.
package matter

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/interp"

	"steelyard/probes/cosmology"
)

// Params states the fluctuations of a background.
type Params struct {
	Sigma8        float64 // rms of the linear density in spheres of 8/h Mpc today
	SpectralIndex float64 // n_s
	OmegaBaryon   float64 // today
}

// Spectrum is the power spectrum of one background. It is not safe for
// concurrent use.
type Spectrum struct {
	background *cosmology.Cosmology
	params     Params
	h          float64
	linear     interp.NaturalCubic // ln P(k) today over ln k
	nonlinear  map[float64]halofit // by redshift; looked up, never ranged over
}

// The table of the linear spectrum reaches from smallest to largest, 1/Mpc.
const smallest, largest, tableSteps = 1e-5, 1e4, 2000

// New prepares a spectrum, normalised to Sigma8.
func New(c *cosmology.Cosmology, p Params) (*Spectrum, error) {
	q := c.Params()
	switch {
	case !(p.Sigma8 > 0 && p.Sigma8 < 3):
		return nil, fmt.Errorf("matter: sigma_8 = %g", p.Sigma8)
	case !(p.SpectralIndex > 0.5 && p.SpectralIndex < 1.5):
		return nil, fmt.Errorf("matter: spectral index %g", p.SpectralIndex)
	case !(p.OmegaBaryon > 0 && p.OmegaBaryon < q.OmegaMatter):
		return nil, fmt.Errorf("matter: baryons of Ω = %g, where all matter has %g", p.OmegaBaryon, q.OmegaMatter)
	}
	s := &Spectrum{background: c, params: p, h: q.HubbleConstant / 100, nonlinear: map[float64]halofit{}}
	t := newTransfer(q.OmegaMatter*s.h*s.h, p.OmegaBaryon*s.h*s.h)
	lnK, lnP := make([]float64, tableSteps+1), make([]float64, tableSteps+1)
	for i := range lnK {
		lnK[i] = math.Log(smallest) + math.Log(largest/smallest)*float64(i)/tableSteps
		k := math.Exp(lnK[i])
		lnP[i] = p.SpectralIndex*lnK[i] + 2*math.Log(t.at(k))
	}
	if err := s.linear.Fit(lnK, lnP); err != nil {
		return nil, fmt.Errorf("matter: %w", err)
	}
	amplitude := 2 * math.Log(p.Sigma8/s.topHat(8/s.h))
	for i := range lnP {
		lnP[i] += amplitude
	}
	if err := s.linear.Fit(lnK, lnP); err != nil {
		return nil, fmt.Errorf("matter: %w", err)
	}
	return s, nil
}

// Linear is the linear power at wavenumber k and redshift z.
func (s *Spectrum) Linear(k, z float64) float64 {
	d := s.background.GrowthFactor(z)
	return d * d * s.today(k)
}

// today is the linear power at redshift 0.
func (s *Spectrum) today(k float64) float64 {
	lnK := math.Log(k)
	switch lo, hi := math.Log(smallest), math.Log(largest); {
	case lnK < lo:
		return math.Exp(s.linear.Predict(lo) + s.params.SpectralIndex*(lnK-lo))
	case lnK > hi: // where k^(n−4) ln² k is falling off
		return math.Exp(s.linear.Predict(hi) + s.linear.PredictDerivative(hi)*(lnK-hi))
	}
	return math.Exp(s.linear.Predict(lnK))
}

// topHat is the rms of today's linear density in spheres of radius R Mpc.
func (s *Spectrum) topHat(R float64) float64 {
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
