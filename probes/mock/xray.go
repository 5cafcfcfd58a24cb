package mock

import (
	"math"
	"math/rand/v2"
)

// Spectra says how the gas is observed: the edges of the bins, in arcmin, and
// the errors.
type Spectra struct {
	DensityEdges []float64
	DensityError float64 // of every shell, a fraction of the density
	// TemperatureEdges bound the annuli. TemperatureErrors are fractions of kT,
	// one an annulus; the error above is larger than the one below by the factor
	// (1+Skew)/(1−Skew).
	TemperatureEdges  []float64
	TemperatureErrors []float64
	Skew              float64
	Scale             float64 // kT quoted is the true one over this; 0 stands for 1
	Scatter           float64 // fractional scatter of spectral temperatures beyond their errors
}

// SpectraData are invented profiles: radii in arcmin, densities in cm⁻³ and
// temperatures in keV.
type SpectraData struct {
	DensityInner, DensityOuter, Density, DensityError                                            []float64
	TemperatureInner, TemperatureOuter, Temperature, TemperatureErrorMinus, TemperatureErrorPlus []float64
}

// Spectra invents a density and a temperature profile of the gas. A nil rng
// leaves the noise out. Equal streams give equal profiles.
func (t Truth) Spectra(g Gas, s Spectra, rng *rand.Rand) *SpectraData {
	a, d := t.Atmosphere(g), new(SpectraData)
	kpc := t.AngularDiameter(t.Redshift) * math.Pi / 180 / 60 // in an arcmin
	for i := range len(s.DensityEdges) - 1 {
		inner, outer := s.DensityEdges[i], s.DensityEdges[i+1]
		n := a.Shell(inner*kpc, outer*kpc)
		d.DensityInner, d.DensityOuter = append(d.DensityInner, inner), append(d.DensityOuter, outer)
		d.Density, d.DensityError = append(d.Density, n), append(d.DensityError, s.DensityError*n)
	}
	if s.Scale == 0 {
		s.Scale = 1
	}
	for i := range len(s.TemperatureEdges) - 1 {
		inner, outer := s.TemperatureEdges[i], s.TemperatureEdges[i+1]
		kT := a.Spectral(inner*kpc, outer*kpc) / s.Scale
		d.TemperatureInner, d.TemperatureOuter = append(d.TemperatureInner, inner), append(d.TemperatureOuter, outer)
		d.Temperature = append(d.Temperature, kT)
		d.TemperatureErrorMinus = append(d.TemperatureErrorMinus, s.TemperatureErrors[i]*kT*(1-s.Skew))
		d.TemperatureErrorPlus = append(d.TemperatureErrorPlus, s.TemperatureErrors[i]*kT*(1+s.Skew))
	}
	if rng != nil {
		d.addNoise(s.Scatter, rng)
	}
	return d
}

// addNoise moves exact profiles by their errors and the scatter of spectral
// temperatures. A datum below the truth has the truth above it, where its upper
// error holds, and the other way round; the two halves meet at the truth.
func (d *SpectraData) addNoise(scatter float64, rng *rand.Rand) {
	for i := range d.Density {
		d.Density[i] += d.DensityError[i] * rng.NormFloat64()
	}
	for i, kT := range d.Temperature {
		below := math.Hypot(d.TemperatureErrorPlus[i], scatter*kT)
		above := math.Hypot(d.TemperatureErrorMinus[i], scatter*kT)
		if rng.Float64() < below/(below+above) {
			d.Temperature[i] -= below * math.Abs(rng.NormFloat64())
		} else {
			d.Temperature[i] += above * math.Abs(rng.NormFloat64())
		}
	}
}
