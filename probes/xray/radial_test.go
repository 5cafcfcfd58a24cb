package xray

import (
	"fmt"
	"math"
	"testing"
)

// The emission of a β model with β = 2/3 has closed forms: between projected
// radii R1 and R2, ∫ n² dV = π² n0² rc³ [(1 + R1²/rc²)^(−½) − (1 + R2²/rc²)^(−½)].
func TestAnnulusOfABetaModel(t *testing.T) {
	const rc = 100.0
	emission := func(r float64) float64 { return math.Pow(1+r*r/(rc*rc), -2) }
	closed := func(R float64) float64 { return math.Pi * math.Pi * rc * rc * rc / math.Sqrt(1+R*R/(rc*rc)) }
	g := newRadial(40, 900, nodesPerEfold)
	for _, c := range []struct{ inner, outer, tolerance float64 }{
		// Beyond the last node, at 18 Mpc, the density is taken as a power of the
		// radius, which matters most to the outermost annuli.
		{0, 40, 1e-9}, {40, 41, 1e-10}, {40, 130, 1e-10}, {130, 900, 1e-8}, {899, 900, 1e-7},
	} {
		var sum float64
		for _, w := range g.annulus(c.inner, c.outer, emission) {
			sum += w
		}
		near(t, fmt.Sprintf("emission between %g and %g kpc", c.inner, c.outer), sum, closed(c.inner)-closed(c.outer), c.tolerance)
	}
}

func TestLineOfSightReference(t *testing.T) {
	var b struct {
		Lines []struct{ Beta, Rc, R, Emission float64 }
	}
	readJSON(t, "isothermal_beta.json", &b)
	for _, l := range b.Lines {
		emission := func(r float64) float64 { return math.Exp(2 * lnBeta(1, l.Rc, l.Beta, r)) }
		g := newRadial(0.2, 1000, nodesPerEfold)
		// A thin annulus about R: the mean over its area differs from the value
		// at R by (width/R)²/24 times a number of order one, 1e-7 here.
		const half = 5e-4
		r1, r2 := l.R*(1-half), l.R*(1+half)
		if l.R == 0 {
			r1, r2 = 0, 0.2
		}
		var sum float64
		for _, w := range g.annulus(r1, r2, emission) {
			sum += w
		}
		near(t, fmt.Sprintf("β = %g, R = %g kpc", l.Beta, l.R), sum/(math.Pi*(r2*r2-r1*r1)), l.Emission, 2e-6)
	}
}

// Shells of a density r^−2 have ∫ r^−2 dV = 4π (r2 − r1).
func TestShell(t *testing.T) {
	g := newRadial(0.3, 900, nodesPerEfold)
	for _, c := range [][2]float64{{0, 40}, {40, 40.5}, {40, 130}, {130, 900}, {0.2, 0.3}} {
		var sum float64
		for _, w := range g.shell(c[0], c[1], func(r float64) float64 { return 1 / (r * r) }) {
			sum += w
		}
		near(t, fmt.Sprint("shell ", c), sum, 4*math.Pi*(c[1]-c[0]), 1e-10)
	}
}

// Interpolating a power of the radius between the nodes costs little: the
// integrals of f·q with q = r^s are those of f·r^s.
func TestInterpolation(t *testing.T) {
	g := newRadial(40, 900, nodesPerEfold)
	f := func(r float64) float64 { return math.Pow(1+r*r/1e4, -4) }
	for _, s := range []float64{-1, -0.3, 0.3, 1} {
		q := func(r float64) float64 { return math.Pow(r, s) }
		for _, edges := range [][2]float64{{40, 130}, {130, 400}, {700, 900}} {
			var sum, want float64
			for j, w := range g.annulus(edges[0], edges[1], f) {
				sum += w * q(g.r[j])
			}
			// The reference carries the power in the weights.
			for _, w := range g.annulus(edges[0], edges[1], func(r float64) float64 { return f(r) * q(r) }) {
				want += w
			}
			// The polynomial errs by h⁶ s⁶/200 at most, 2e-8.
			near(t, fmt.Sprintf("r^%g over %v", s, edges), sum, want, 3e-8)
		}
	}
}

func TestProjectionReference(t *testing.T) {
	ref, gas := readReference(t)
	s := &Spectra{Projected: true}
	for _, a := range ref.Annuli {
		s.Inner, s.Outer = append(s.Inner, a.Inner), append(s.Outer, a.Outer)
		s.Value = append(s.Value, a.KT)
	}
	a := newAtmosphere(gas, s, nodesPerEfold)
	st := a.newState()
	for j, r := range a.grid.r {
		st.ratio[j], st.kT[j] = 1, ref.kT(r)
	}
	a.look(st)
	for i, want := range ref.Annuli {
		var emission float64
		for _, w := range a.bins[i].weight {
			emission += w / electronsPerProton
		}
		name := fmt.Sprintf("annulus %g to %g kpc", want.Inner, want.Outer)
		// The innermost half kpc is taken as of one temperature; beyond 26 Mpc
		// likewise, where the temperature falls.
		near(t, name+", emission", emission, want.EmissionMeasure, 1e-7)
		near(t, name+", kT", st.Bins[i], want.KT, 2e-7)
	}
}
