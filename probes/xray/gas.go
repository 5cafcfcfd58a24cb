package xray

import (
	"math"

	"gonum.org/v1/gonum/floats"

	"steelyard/probes/constants"
)

// Gas is what is known of the electron density: a form with its best
// parameters, and how its logarithm may move about them,
//
//	ln n_e(r) = ln n̂_e(r) + Σ_k z_k φ_k(r),   z_k ~ N(0, 1),
//
// φ_k being the derivative of ln n_e along the k-th independent direction of
// the parameters' errors. The directions are those of the posterior's normal
// approximation at its maximum, carried to ln n_e to first order: along a
// direction in which the parameters trade off against each other, the density
// in the data's range, which the shells fix to a few per cent, then stays
// where the shells want it (TestDensityErrors compares with a long chain).
type Gas struct {
	Form       Form
	Parameters []float64
	// Moves holds for each direction the change of every parameter: φ_k is the
	// derivative of ln n_e along Moves[k].
	Moves [][]float64
	// Inner and Outer bound the data, in kpc; both zero for a published model.
	Inner, Outer float64
	Words        string // the form and what it was fitted to, for the reader
	Fitted       bool   // to data, rather than published
	Chi2         float64
	Dof          int
	Notes        []string
}

// LnElectrons returns ln n_e in cm⁻³ at r kpc for the best parameters.
func (g *Gas) LnElectrons(r float64) float64 { return g.Form.lnElectrons(g.Parameters, r) }

// Slope returns d ln n_e / d ln r at r kpc and its standard deviation.
func (g *Gas) Slope(r float64) (slope, sd float64) {
	var variance float64
	for k := range g.Moves {
		d := g.ModeSlope(k, r)
		variance += d * d
	}
	return g.Form.slope(g.Parameters, r), math.Sqrt(variance)
}

// Mode returns φ_k at r kpc.
func (g *Gas) Mode(k int, r float64) float64 { return g.along(k, g.Form.lnElectrons, r) }

// ModeSlope returns d φ_k / d ln r at r kpc.
func (g *Gas) ModeSlope(k int, r float64) float64 { return g.along(k, g.Form.slope, r) }

// along is the derivative of a function of the parameters along Moves[k].
func (g *Gas) along(k int, f func(p []float64, r float64) float64, r float64) float64 {
	const h = 1e-3
	at := func(h float64) float64 {
		p := append([]float64(nil), g.Parameters...)
		floats.AddScaled(p, h, g.Moves[k])
		return f(p, r)
	}
	return (at(h) - at(-h)) / (2 * h)
}

// Mass returns the mass of the gas inside r kpc in Msun,
//
//	M_gas(<r) = 4π μ_e m_p ∫ n_e r² dr,
//
// for the best parameters, μ_e = electron being the gas's mass per electron in
// proton masses. It sums a ten-point Gauss–Legendre rule over each half factor e
// of radius, to 1e-12 of itself, and takes what lies inside 1e-12 r as nothing.
func (g *Gas) Mass(r, electron float64) float64 {
	const width, panels = 0.5, 56
	var sum float64
	for p := range panels {
		for q, x := range gauss.x {
			s := r * math.Exp(-width*(float64(p)+(1-x)/2))
			sum += gauss.w[q] * s * s * s * math.Exp(g.LnElectrons(s))
		}
	}
	return 4 * math.Pi * sum * width / 2 * electron * constants.ProtonMassPerCubicKpc
}
