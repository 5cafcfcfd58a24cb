package xray

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"testing"

	"gonum.org/v1/gonum/stat"

	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/mock"
	"steelyard/probes/prior"
)

// windows are the priors of the calibration, from which the truths are drawn.
func windows(t testing.TB) map[string]prior.Prior {
	w := make(map[string]prior.Prior)
	for name, v := range map[string]method.Value{
		"mass":                 must(prior.LogUniform(2e14, 2e15)),
		"concentration":        must(prior.LogNormal(4.5, 0.4)),
		"outer_pressure_ratio": must(prior.LogNormal(1, 0.4)),
		"temperature_scatter":  must(prior.HalfNormal(0.05)),
		"temperature_scale":    must(prior.Normal(1, 0.04)),
	} {
		w[name] = v.Prior
	}
	return w
}

// TestCoverage weighs invented clusters whose truths are drawn from the priors
// of the analysis: the 68% interval of M_500 must hold the truth in 68.3% of
// them, within three binomial standard errors, and ln M_500 must be unbiased to
// a fifth of its error.
func TestCoverage(t *testing.T) {
	if os.Getenv("STEELYARD_SLOW") == "" {
		t.Skip("a calibration of some minutes; set STEELYARD_SLOW=1 to run it")
	}
	const mocks = 200
	for _, c := range []struct {
		name         string
		method       estimate.Method
		densityError float64
	}{{"backward", backward, 0.03}, {"backward, shells with errors of 15%", backward, 0.15}, {"forward", forward, 0.03}} {
		t.Run(c.name, func(t *testing.T) { calibrate(t, c.method, c.densityError, mocks) })
	}
}

func calibrate(t *testing.T, m estimate.Method, densityError float64, mocks int) {
	rng := rand.New(rand.NewPCG(2024, 6))
	draw := func(p prior.Prior) float64 { return p.FromScore(rng.NormFloat64()) }
	var inside50, inside68, inside95 int
	var offsets, errors, ranks []float64
	w := windows(t)
	for i := range mocks {
		object := truth
		object.M200, object.C200 = draw(w["mass"]), draw(w["concentration"])
		s := typical()
		s.DensityError = densityError
		s.Scale, s.Scatter = draw(w["temperature_scale"]), draw(w["temperature_scatter"])
		kpc := object.AngularDiameter(object.Redshift) * math.Pi / 180 / 60
		last := s.TemperatureEdges[len(s.TemperatureEdges)-1] * kpc
		gas := mock.Gas{Electrons: coolCore.Electrons, Edge: last, Share: draw(w["outer_pressure_ratio"])}
		task := observed(t, object.Spectra(gas, s, rng))
		for _, setting := range m.Settings { // forward has no mass model
			if p, ok := w[setting.Name]; ok {
				task.Settings[setting.Name] = method.Value{Set: true, Prior: p}
			}
		}
		task.Settings["intrinsic_scatter"] = method.Exactly(0)
		task.Sampling = infer.Options{Draws: 1000, Stream: infer.NewStream("coverage", fmt.Sprint(i))}
		fillDefaults(m.Settings, task.Settings)
		if err := reduceAll(task); err != nil {
			t.Fatal(err)
		}
		d, err := m.Run(context.Background(), task)
		if err != nil {
			t.Fatal(err)
		}
		threshold := 500 * object.CriticalDensity()
		h := halo.NewNFW(object.M200, object.C200, 0.4*threshold)
		r, err := halo.RadiusAt(h, threshold)
		if err != nil {
			t.Fatal(err)
		}
		want := math.Log(h.Mass(r))
		ln := make([]float64, d.N)
		below := 0.0
		for k := range ln {
			r, ok := d.RadiusAt(k, threshold)
			if !ok {
				t.Fatalf("mock %d: no r_500 in draw %d", i, k)
			}
			ln[k] = math.Log(4 * math.Pi / 3 * threshold * r * r * r)
			if ln[k] < want {
				below++
			}
		}
		q := infer.Percentiles(ln, 2.5, 16, 25, 75, 84, 97.5)
		count := func(n *int, lo, hi float64) {
			if lo <= want && want <= hi {
				*n++
			}
		}
		count(&inside95, q[0], q[5])
		count(&inside68, q[1], q[4])
		count(&inside50, q[2], q[3])
		mean, sd := stat.MeanStdDev(ln, nil)
		offsets, errors, ranks = append(offsets, mean-want), append(errors, sd), append(ranks, below/float64(d.N))
		if !d.Quality.Converged {
			t.Logf("mock %d: not converged, %+v", i, d.Quality)
		}
	}
	n := float64(mocks)
	bias, spread := stat.MeanStdDev(offsets, nil)
	typicalError := stat.Mean(errors, nil)
	t.Logf("coverage of 50%%: %.3f, 68%%: %.3f ± %.3f, 95%%: %.3f; bias of ln M500 %+.4f ± %.4f, typical error %.3f; mean rank %.3f ± %.3f",
		float64(inside50)/n, float64(inside68)/n, math.Sqrt(0.683*0.317/n), float64(inside95)/n, bias, spread/math.Sqrt(n), typicalError,
		stat.Mean(ranks, nil), math.Sqrt(1/12.0/n))
	if got := float64(inside68) / n; math.Abs(got-0.68) > 3*math.Sqrt(0.68*0.32/n) {
		t.Errorf("the 68%% interval holds the truth in %.1f%% of %d mocks", 100*got, mocks)
	}
	// For forward the bias is reported, not bounded: its forms are not the truth's.
	if m.Name == backward.Name && math.Abs(bias) > typicalError/5 {
		t.Errorf("ln M500 is biased by %+.4f, the typical error is %.3f", bias, typicalError)
	}
}
