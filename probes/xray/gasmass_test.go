package xray

import (
	"fmt"
	"math"
	"testing"
)

// The mass of the gas of the reference cluster, for 1.17 proton masses an
// electron.
func TestGasMassReference(t *testing.T) {
	ref, gas := readReference(t)
	for _, row := range ref.Profile {
		near(t, fmt.Sprintf("gas within %g kpc", row.R), gas.Mass(row.R, 1.17), row.GasMass, 1e-10)
	}
	for _, o := range ref.Overdensities {
		near(t, fmt.Sprintf("gas within r_%g", o.Delta), gas.Mass(o.R, 1.17), o.GasMass, 1e-10)
	}
	m := newGasMass(gas, newAtmosphere(gas, annuli(0, 50, 200, 1000), nodesPerEfold))
	m.move(nil)
	for _, r := range []float64{10, 77, 500, 999, 1001, 2500} {
		// Between the nodes ln M is a polynomial of degree five.
		near(t, fmt.Sprintf("gas within %g kpc from the nodes", r), m.within(r, 1.17), gas.Mass(r, 1.17), 1e-6)
	}
}

// A move of ln n_e by a constant multiplies the mass.
func TestGasMassMoves(t *testing.T) {
	gas := gasOf(coolCore)
	air := newAtmosphere(gas, annuli(0, 50, 200, 1000), nodesPerEfold)
	one := make([]float64, len(air.grid.r))
	for j := range one {
		one[j] = 1
	}
	air.modes = [][]float64{one}
	m := newGasMass(gas, air)
	m.move(nil)
	before := m.within(700, 1.17)
	m.move([]float64{0.25})
	near(t, "gas mass", m.within(700, 1.17)/before, math.Exp(0.25), 1e-12)
}
