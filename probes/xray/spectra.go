package xray

import "math"

// sides returns the errors of bin i below and above, the scatter of spectral
// temperatures added in quadrature: a fraction of the model's own temperature
// kT, for that is what scatters.
func (s *Spectra) sides(i int, kT, scatter float64) (below, above float64) {
	extra := scatter * kT
	return math.Sqrt(s.Minus[i]*s.Minus[i] + extra*extra), math.Sqrt(s.Plus[i]*s.Plus[i] + extra*extra)
}

// lnLikelihood is ln of the probability density of the quoted temperatures for
// the model's temperatures kT, in keV. The model is seen through the
// calibration, T_quoted = T_true/scale. An error's side is chosen by the model:
// the upper one where the model lies above the datum. Both sides share one
// normalisation, that of the two-piece normal, so that the likelihood has no
// step where the model crosses the datum, and a larger scatter has its price.
func (s *Spectra) lnLikelihood(kT []float64, scale, scatter float64) float64 {
	var ln float64
	for i, v := range s.Value {
		model := kT[i] / scale
		below, above := s.sides(i, model, scatter)
		d := model - v
		width := below
		if d > 0 {
			width = above
		}
		d /= width
		ln -= d*d/2 + math.Log((below+above)/2)
	}
	return ln - float64(len(s.Value))*lnRoot2Pi
}

var lnRoot2Pi = math.Log(2*math.Pi) / 2

// pulls fills out with (model − datum)/error of every bin.
func (s *Spectra) pulls(kT []float64, scale, scatter float64, out []float64) {
	for i, v := range s.Value {
		model := kT[i] / scale
		below, above := s.sides(i, model, scatter)
		if d := model - v; d > 0 {
			out[i] = d / above
		} else {
			out[i] = d / below
		}
	}
}

// chi2 is the sum of the squared pulls.
func (s *Spectra) chi2(kT []float64, scale, scatter float64) float64 {
	out := make([]float64, len(s.Value))
	s.pulls(kT, scale, scatter, out)
	var sum float64
	for _, x := range out {
		sum += x * x
	}
	return sum
}
