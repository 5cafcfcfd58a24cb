package xray

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"steelyard/probes/constants"
	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/method"
	"steelyard/probes/mock"
)

func TestNelson(t *testing.T) {
	// From the formula with a pocket calculator: 1 − 2·0.452 at the centre;
	// (1/0.841)^1.628 = 1.325660 and e^(−1.325660) = 0.2656276 at r_200m.
	centre, _ := nelson(1e-9)
	near(t, "share at the centre", centre, 0.096, 1e-6)
	edge, slope := nelson(1)
	near(t, "share at r_200m", edge, 1-0.452*(1+0.2656276), 1e-6)
	const h = 1e-5
	up, _ := nelson(math.Exp(h))
	down, _ := nelson(math.Exp(-h))
	near(t, "slope at r_200m", slope, (up-down)/(2*h), 1e-8)
}

// nelsonTask is a task with the radial share.
func nelsonTask(t testing.TB, settings []method.Setting, scale float64) *estimate.Task {
	task := observed(t, &mock.SpectraData{})
	task.Settings["nonthermal_profile"] = method.Word("nelson-2014")
	task.Settings["nonthermal_scale"] = method.Exactly(scale)
	fillDefaults(settings, task.Settings)
	return task
}

// Gas held up in part by motions, put to rest by backward, has slopes from which
// forward's equation reads the same mass.
func TestRadialShareBothWays(t *testing.T) {
	s := annuli(edgesBetween(40, 1500, 8, false)...)
	task := nelsonTask(t, backward.Settings, 1.2)
	b := backwardOn(t, task, gasOf(coolCore), s)
	b.air = newAtmosphere(gasOf(coolCore), s, 4*nodesPerEfold)
	st := b.air.newState()
	theta := []float64{8e14, 4.5, 0.9, 0}
	if !b.predict(st, theta) {
		t.Fatal("no atmosphere")
	}
	h := b.halo(theta)
	mean, err := halo.Definition{Delta: 200, Of: "mean"}.Threshold(task.Cosmology, truth.Redshift)
	if err != nil {
		t.Fatal(err)
	}
	r200m, err := halo.RadiusAt(h, mean)
	if err != nil {
		t.Fatal(err)
	}
	for j, r := range b.air.grid.r {
		if r < 60 || r > 1300 {
			continue
		}
		f := func(k int) float64 { return math.Log(st.kT[j+k]) }
		slope := (f(-2) - 8*f(-1) + 8*f(1) - f(2)) / (12 * b.air.grid.step)
		share, bend := b.support.thermal(theta, r/r200m)
		mass := -constants.HydrostaticMass / (0.6 * share) * st.kT[j] * r * (b.gas.Form.slope(b.gas.Parameters, r) + slope - bend)
		// Five-point differences with steps of 1/32 err by 1e-6 of the slope, near
		// the edge of the data ten times that.
		near(t, fmt.Sprintf("mass within %.4g kpc", r), mass, h.Mass(r), 3e-5)
	}
	// The temperatures give the halo back, and without the share a lighter one.
	for i, kT := range st.Bins {
		s.Value[i], s.Minus[i], s.Plus[i] = kT, 1e-5, 1e-5
	}
	best, err := b.prepare()
	if err != nil {
		t.Fatal(err)
	}
	near(t, "mass_200c", b.mass.Of(best.theta), 8e14, 1e-5)
	plain := observed(t, &mock.SpectraData{})
	fillDefaults(backward.Settings, plain.Settings)
	p := backwardOn(t, plain, gasOf(coolCore), s)
	if best, err = p.prepare(); err != nil {
		t.Fatal(err)
	}
	if ratio := p.halo(best.theta).Mass(1000) / h.Mass(1000); ratio > 0.85 || ratio < 0.6 {
		t.Errorf("without the share the mass inside 1 Mpc is %.2f of the truth", ratio)
	}
}

// The radius that the share needs belongs to the mass that the share gives.
func TestRadialShareSettles(t *testing.T) {
	task := nelsonTask(t, forward.Settings, 1)
	w, err := newForward(&fit{task: task, gas: gasOf(coolCore), spectra: annuli(edgesBetween(40, 1500, 8, false)...)}, shortForm)
	if err != nil {
		t.Fatal(err)
	}
	m := w.newSlopes()
	form := temperature{T0: 7, rt: 900, b: 2, c: 0.9, Tmin: 1, rcool: 1, acool: 1}
	theta := make([]float64, len(w.parameters.Free))
	r := m.radius200m(theta, &form)
	at := slopeTable{ln: []float64{math.Log(r)}, base: []float64{w.gas.Form.slope(w.gas.Parameters, r)}}
	// Read between radii a seventh of a factor e apart, by a straight line in the
	// logarithms.
	near(t, "mean density inside r_200m", m.mass(theta, &form, &at, 0, r)/(4*math.Pi/3*r*r*r), w.support.threshold, 5e-3)
}

func TestShareStatedTwice(t *testing.T) {
	task := nelsonTask(t, backward.Settings, 1)
	task.Settings["nonthermal_fraction"] = method.Exactly(0.1)
	_, err := newBackward(&fit{task: task, gas: gasOf(coolCore), spectra: annuli(0, 100, 300)})
	if err == nil || !strings.Contains(err.Error(), "set nonthermal_scale instead") {
		t.Errorf("a constant and a radial share: %v", err)
	}
}
