package xray

import (
	"context"
	"math"
	"math/rand/v2"
	"os"
	"testing"

	"gonum.org/v1/gonum/stat"

	"steelyard/probes/infer"
	"steelyard/probes/mock"
)

// The directions are independent, ordered by influence, and turning them leaves
// the density's errors what they were.
func TestTurnKeepsTheErrors(t *testing.T) {
	task := observed(t, truth.Spectra(mock.Gas{Electrons: coolCore.Electrons}, typical(), rand.New(rand.NewPCG(8, 1))))
	fillDefaults(backward.Settings, task.Settings)
	if err := reduceAll(task); err != nil {
		t.Fatal(err)
	}
	f, err := newFit(task)
	if err != nil {
		t.Fatal(err)
	}
	radii := []float64{30, 200, 900}
	var before, slopes []float64
	for _, r := range radii {
		_, sd := f.gas.Slope(r)
		before, slopes = append(before, f.gas.deviation(r)), append(slopes, sd)
	}
	b, err := newBackward(f)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := b.prepare(); err != nil {
		t.Fatal(err)
	}
	for i, r := range radii {
		near(t, "sd of ln n_e", f.gas.deviation(r), before[i], 1e-6)
		_, sd := f.gas.Slope(r)
		near(t, "sd of the slope", sd, slopes[i], 1e-5)
	}
	if len(f.gas.Moves) < b.moves || len(f.gas.Moves) != len(f.air.modes) {
		t.Errorf("%d directions, %d on the nodes, %d drawn", len(f.gas.Moves), len(f.air.modes), b.moves)
	}
}

// Drawing every direction of the density's errors, and not only those with an
// influence, gives the same mass with the same error, and a density without
// errors a smaller one: shells of 15% reach the mass.
func TestDensityErrorsReachTheMass(t *testing.T) {
	if os.Getenv("STEELYARD_SLOW") == "" {
		t.Skip("draws three posteriors of many dimensions; set STEELYARD_SLOW=1 to run it")
	}
	s := typical()
	s.DensityError = 0.15
	for i := range s.TemperatureErrors {
		s.TemperatureErrors[i] = 0.02
	}
	task := observed(t, truth.Spectra(mock.Gas{Electrons: coolCore.Electrons}, s, rand.New(rand.NewPCG(9, 1))))
	fillDefaults(backward.Settings, task.Settings)
	if err := reduceAll(task); err != nil {
		t.Fatal(err)
	}
	drawn := func(change func(*backwardFit)) (mean, sd float64) {
		b, _ := prepared(t, task)
		change(b)
		sample, err := infer.DrawPosterior(context.Background(), b.problem(), task.Sampling)
		if err != nil {
			t.Fatal(err)
		}
		ln := make([]float64, len(sample.Values))
		for i, theta := range sample.Values {
			ln[i] = math.Log(b.halo(theta).Mass(1000))
		}
		return stat.MeanStdDev(ln, nil)
	}
	mean, sd := drawn(func(*backwardFit) {})
	all, sdAll := drawn(func(b *backwardFit) { b.moves = len(b.air.modes) })
	none, sdNone := drawn(func(b *backwardFit) { b.moves = 0 })
	t.Logf("ln M(1 Mpc): drawn %.4f ± %.4f, all %.4f ± %.4f, none %.4f ± %.4f", mean, sd, all, sdAll, none, sdNone)
	// 4000 draws of some 3000 effective give the error to 2%.
	if math.Abs(mean-all) > 0.1*sdAll || math.Abs(sd/sdAll-1) > 0.08 {
		t.Errorf("ln M(1 Mpc) is %.4f ± %.4f, with every direction drawn %.4f ± %.4f", mean, sd, all, sdAll)
	}
	if sdNone > 0.97*sd {
		t.Errorf("without the density's errors the error is %.4f, with them %.4f", sdNone, sd)
	}
}
