package dynamics

import (
	"math"
	"sync"

	"gonum.org/v1/gonum/integrate/quad"

	"steelyard/probes/halo"
)

// The kinematics of an isotropic NFW halo whose tracers follow its mass, in the
// halo's own units: radii in r_s, squared velocities in G M_s/r_s with
// M_s = 4πρ_s r_s³. In these units everything depends on x = r/r_s alone.
var unit = halo.NFW{RhoS: 1 / (4 * math.Pi), Rs: 1}

// panels integrates f from 0 to at least end in panels of width 2 with 16
// Gauss–Legendre nodes each, one panel after the other.
func panels(end float64, f func(t float64) float64) float64 {
	const width, nodes = 2.0, 16
	sum := 0.0
	for from := 0.0; from < end; from += width {
		for i := range nodes {
			sum += panelWeight[i] * f(from+panelNode[i])
		}
	}
	return sum
}

var panelNode, panelWeight = func() (x, w []float64) {
	x, w = make([]float64, 16), make([]float64, 16)
	quad.Legendre{}.FixedLocations(x, w, 0, 2)
	return x, w
}()

// projectedPressure returns σ_los²(R) Σ(R)/G of tracers of density ν in a mass M,
//
//	2 ∫_R^∞ K(r/R) ν(r) M(r) dr/r
//
// for the anisotropy kernel K (Mamon & Łokas 2005, eq. A15), with r = R cosh t;
// reach is the largest scale radius of ν and M.
func projectedPressure(R, reach float64, density, mass, kernel func(float64) float64) float64 {
	// Beyond the scale radius ν M K falls at least as r⁻², so 18 e-foldings
	// leave less than 1e-15.
	end := math.Log(2*math.Max(1, reach/R)) + 18
	return 2 * panels(end, func(t float64) float64 {
		u := math.Cosh(t)
		r := R * u
		return kernel(u) * density(r) * mass(r) * math.Tanh(t)
	})
}

// isotropicKernel is K(u) = (1 − 1/u²)^½ (Mamon & Łokas 2005, eq. A16, β = 0).
func isotropicKernel(u float64) float64 { return math.Sqrt(1 - 1/(u*u)) }

// radialVariance is σ_r²(x) of the isotropic halo: the Jeans equation's
//
//	σ_r² = (1/ρ) ∫_x^∞ ρ G M dr/r².
func radialVariance(x float64) float64 {
	// r = x e^t.
	integral := panels(math.Log(math.Max(1, 1/x))+14, func(t float64) float64 {
		r := x * math.Exp(t)
		return 4 * math.Pi * unit.Density(r) * unit.Mass(r) / r
	})
	return integral / (4 * math.Pi * unit.Density(x))
}

// lineOfSightVariance is σ_los²(X) of the isotropic halo at the projected
// radius X.
func lineOfSightVariance(X float64) float64 {
	return projectedPressure(X, 1, unit.Density, unit.Mass, isotropicKernel) / unit.SurfaceDensity(X)
}

// sphereVariance is the one-dimensional variance of all tracers inside the
// sphere of radius x, a third of the mean squared speed: by the virial theorem
// with its surface term,
//
//	3 σ² m(x) = 4πx³ρ(x)σ_r²(x) + ∫_0^x 4πr²ρ (G M/r) dr.
func sphereVariance(x float64) float64 {
	surface, potential := virialTerms(x)
	return (surface + potential) / (3 * unit.Mass(x))
}

// virialTerms returns the surface-pressure term 4πx³ρσ_r² and the potential
// term −W = ∫ 4πr²ρ GM/r dr of the sphere of radius x.
func virialTerms(x float64) (surface, potential float64) {
	surface = 4 * math.Pi * x * x * x * unit.Density(x) * radialVariance(x)
	// r = x e^−t.
	potential = panels(14, func(t float64) float64 {
		r := x * math.Exp(-t)
		return 4 * math.Pi * r * r * unit.Density(r) * unit.Mass(r)
	})
	return surface, potential
}

// table is a smooth function of ln x given at evenly spaced points, read by
// four-point interpolation and held constant beyond its ends.
type table struct {
	from, step float64
	values     []float64
}

func tabulate(from, to, step float64, f func(x float64) float64) table {
	n := int(math.Round((to-from)/step)) + 1
	t := table{from, step, make([]float64, n)}
	for i := range t.values {
		t.values[i] = f(math.Exp(from + float64(i)*step))
	}
	return t
}

func (t table) at(lnX float64) float64 {
	i, w := t.place(lnX)
	v := t.values[i : i+4]
	return w[0]*v[0] + w[1]*v[1] + w[2]*v[2] + w[3]*v[3]
}

// place returns the first of the four points around ln x and their weights.
func (t table) place(lnX float64) (first int, w [4]float64) {
	s := (lnX - t.from) / t.step
	n := len(t.values)
	s = min(max(s, 0), float64(n-1))
	first = min(max(int(s)-1, 0), n-4)
	a := s - float64(first)
	b, c, d := a-1, a-2, a-3
	return first, [4]float64{-b * c * d / 6, a * c * d / 2, -a * b * d / 2, a * b * c / 6}
}

const (
	tableFrom = -9.2 // ln x: 1e-4 to 1e3
	tableTo   = 7
	tableStep = 0.1
)

// losTable is lineOfSightVariance over ln X, good to 1e-6.
var losTable = sync.OnceValue(func() table {
	return tabulate(tableFrom, tableTo, tableStep, lineOfSightVariance)
})

// sphereTable is sphereVariance over ln x, good to 1e-6.
var sphereTable = sync.OnceValue(func() table {
	return tabulate(tableFrom, tableTo, tableStep, sphereVariance)
})

// pressureTable is the share of the virial mass inside the sphere of radius x,
// over ln x: one minus the surface-pressure term over ∫ρ⟨v²⟩,
//
//	1 − 4πx³ρσ_r² / (4πx³ρσ_r² − W).
var pressureTable = sync.OnceValue(func() table {
	return tabulate(tableFrom, tableTo, tableStep, func(x float64) float64 {
		surface, potential := virialTerms(x)
		return potential / (surface + potential)
	})
})

// apertureTable is the line-of-sight variance of all tracers inside the
// projected radius X over ln X: the mean of σ_los² weighted with Σ(R) R.
var apertureTable = sync.OnceValue(func() table {
	los := losTable()
	var sum float64 // ∫ Σ σ_los² R dR up to the last point
	last := math.Inf(-1)
	return tabulate(tableFrom, tableTo, tableStep, func(X float64) float64 {
		lnX := math.Log(X)
		weighted := func(ln float64) float64 {
			R := math.Exp(ln)
			return unit.SurfaceDensity(R) * los.at(ln) * R * R
		}
		if math.IsInf(last, -1) {
			// Σ varies as ln R here: its mean inside X times the local variance.
			sum = unit.MeanSurfaceDensity(X) * los.at(lnX) * X * X / 2
		} else {
			sum += quad.Fixed(weighted, last, lnX, 8, nil, 0)
		}
		last = lnX
		return sum / (unit.MeanSurfaceDensity(X) * X * X / 2)
	})
})
