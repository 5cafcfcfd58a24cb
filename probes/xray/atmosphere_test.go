package xray

import (
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/floats"

	"steelyard/probes/halo"
	"steelyard/probes/mock"
)

func (a *atmosphere) fill(s *state, m interface{ Mass(r float64) float64 }) {
	for j, r := range a.grid.r {
		s.mass[j], s.thermal[j] = m.Mass(r), 1
	}
}

// The mock puts the same gas into the same halo by adding up shells, pressures
// and lines of sight.
func TestAtmosphereAgainstBruteForce(t *testing.T) {
	h := halo.NewNFW(truth.M200, truth.C200, 200*truth.CriticalDensity())
	s := annuli(0, 60, 130, 250, 420, 650, 1000, 1400)
	for _, c := range []struct{ share, temperature, bin float64 }{
		// The mock's rings err by 1e-5, in the centre by 1.6e-4. Below η = 1 the
		// pressure falls steeply towards the edge, and five-degree polynomials
		// follow it to 1e-4; a datum's error is a hundred times larger.
		{1, 3e-7, 2e-5}, {0.6, 3e-7, 1.2e-4}, {2, 3e-7, 2e-5},
	} {
		a := newAtmosphere(gasOf(coolCore), s, nodesPerEfold)
		st := a.newState()
		a.fill(st, h)
		for j := range st.thermal {
			st.thermal[j] = 0.9
		}
		if !a.solve(st, 0.6, c.share, nil) {
			t.Fatal("no atmosphere")
		}
		m := truth.Atmosphere(mock.Gas{Electrons: coolCore.Electrons, Nonthermal: 0.1, Edge: 1400, Share: c.share})
		for j, r := range a.grid.r {
			if r < 1500 {
				near(t, fmt.Sprintf("η = %g, kT at %.4g kpc", c.share, r), st.kT[j], m.Temperature(r), c.temperature)
			}
		}
		for i := range s.Value {
			tolerance := c.bin
			if i == 0 {
				tolerance = 2e-4
			}
			near(t, fmt.Sprintf("η = %g, bin %d", c.share, i), st.Bins[i], m.Spectral(s.Inner[i], s.Outer[i]), tolerance)
		}
	}
}

// betaMass is the mass that holds isothermal gas of a β model (Cavaliere &
// Fusco-Femiano 1978), M = 3 β kT r³/(G μ m_p (r² + rc²)).
type betaMass struct{ kT, beta, rc, mu float64 }

func (b betaMass) Mass(r float64) float64 { return isothermalBeta(b.kT, b.beta, b.rc, b.mu, r) }

// Isothermal gas in that mass comes out at one temperature everywhere, in
// projection too.
func TestIsothermalLimit(t *testing.T) {
	for _, b := range []betaMass{{5, 0.67, 200, 0.6}, {2, 0.5, 50, 0.59}} {
		gas := &Gas{Form: Beta, Parameters: []float64{0.004, b.rc, b.beta}}
		a := newAtmosphere(gas, annuli(0, 50, 200, 600, 1000), nodesPerEfold)
		st := a.newState()
		a.fill(st, b)
		if !a.solve(st, b.mu, 1, nil) {
			t.Fatal("no atmosphere")
		}
		for j, r := range a.grid.r {
			// The pressure beyond the last node, at 20 Mpc, is a series of two terms
			// and good to 2e-4; at the data's edge that is 1e-6.
			tolerance := 1e-6
			if r > 1100 {
				tolerance = 2e-4
			}
			near(t, fmt.Sprintf("kT at %.4g kpc", r), st.kT[j], b.kT, tolerance)
		}
		for i, kT := range st.Bins {
			near(t, fmt.Sprintf("bin %d", i), kT, b.kT, 1e-6)
		}
	}
}

// Without noise the halo comes back: gas at rest in an NFW halo, seen in shells
// and in projection by the brute force of the mock.
func TestEquilibriumRecovered(t *testing.T) {
	kpc := truth.AngularDiameter(truth.Redshift) * math.Pi / 180 / 60
	for _, projected := range []bool{false, true} {
		task := observed(t, truth.Spectra(mock.Gas{Electrons: coolCore.Electrons}, typical(), nil))
		fillDefaults(backward.Settings, task.Settings)
		s := annuli(edgesBetween(60, 6*kpc, 10, false)...)
		s.Projected = projected
		a := newAtmosphere(gasOf(coolCore), s, 2*nodesPerEfold)
		m := truth.Atmosphere(mock.Gas{Electrons: coolCore.Electrons})
		for i := range s.Value {
			s.Value[i] = m.ShellTemperature(s.Inner[i], s.Outer[i])
			if projected {
				s.Value[i] = m.FineSpectral(s.Inner[i], s.Outer[i])
			}
			s.Minus[i], s.Plus[i] = 1e-6, 1e-6 // so small that the priors do not pull
		}
		b := backwardOn(t, task, gasOf(coolCore), s)
		b.air = a
		best, err := b.prepare()
		if err != nil {
			t.Fatal(err)
		}
		found := b.halo(best.theta)
		want := truth.Halo()
		for _, r := range []float64{100, 500, 1000, 1500} {
			near(t, fmt.Sprintf("projected %t: mass inside %g kpc", projected, r), found.Mass(r), want.Mass(r), 1e-6)
		}
		near(t, "outer pressure ratio", b.outer.Of(best.theta), 1, 1e-5)
	}
}

// A density known to within a common factor says nothing about the mass: the
// temperatures stay where they are.
func TestDensityFactorIsFree(t *testing.T) {
	gas := gasOf(coolCore)
	gas.Moves = [][]float64{make([]float64, len(gas.Parameters))}
	gas.Moves[0][0], gas.Moves[0][7] = gas.Parameters[0], gas.Parameters[7] // both components
	a := newAtmosphere(gas, annuli(0, 100, 400, 1000), nodesPerEfold)
	phi := make([]float64, len(a.grid.r))
	for j, r := range a.grid.r {
		phi[j] = gas.Mode(0, r)
	}
	if !floats.EqualFunc(phi, phi, func(x, _ float64) bool { return math.Abs(x-1) < 1e-6 }) {
		t.Fatalf("the direction of a common factor is not one everywhere: %v", phi)
	}
	a.modes = [][]float64{phi}
	st := a.newState()
	a.fill(st, halo.NewNFW(truth.M200, truth.C200, 200*truth.CriticalDensity()))
	a.solve(st, 0.6, 1.3, []float64{0})
	before := append([]float64(nil), st.Bins...)
	a.solve(st, 0.6, 1.3, []float64{0.3})
	for i := range before {
		near(t, fmt.Sprint("bin ", i), st.Bins[i], before[i], 1e-6)
	}
}
