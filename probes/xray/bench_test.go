package xray

import (
	"context"
	"math/rand/v2"
	"testing"

	"steelyard/probes/estimate"
	"steelyard/probes/mock"
)

// benchmarked is the case: 60 shells and 14 annuli.
func benchmarked(b *testing.B) *estimate.Task {
	s := mock.Spectra{
		DensityEdges: edgesBetween(0.05, 8, 60, true), DensityError: 0.03,
		TemperatureEdges: edgesBetween(0.2, 6.5, 14, true), Skew: 0.1, Scatter: 0.03,
	}
	for i := range 14 {
		s.TemperatureErrors = append(s.TemperatureErrors, 0.02+0.01*float64(i))
	}
	task := observed(b, truth.Spectra(mock.Gas{Electrons: coolCore.Electrons}, s, rand.New(rand.NewPCG(1, 2))))
	fillDefaults(backward.Settings, task.Settings)
	if err := reduceAll(task); err != nil {
		b.Fatal(err)
	}
	return task
}

// BenchmarkReduce is the reading of the shells and the fit of their density.
func BenchmarkReduce(b *testing.B) {
	task := benchmarked(b)
	for b.Loop() {
		if err := reduceAll(task); err != nil {
			b.Fatal(err)
		}
	}
}

// BenchmarkPrepare is what backward does before it draws.
func BenchmarkPrepare(b *testing.B) {
	task := benchmarked(b)
	for b.Loop() {
		prepared(b, task)
	}
}

// BenchmarkLikelihood is one likelihood of backward.
func BenchmarkLikelihood(b *testing.B) {
	m, best := prepared(b, benchmarked(b))
	theta := append(append([]float64(nil), best.theta[:len(m.parameters.Free)]...), make([]float64, m.moves)...)
	f := m.problem().Likelihood()
	for b.Loop() {
		f(theta)
	}
}

// BenchmarkBackward is a whole estimate with 4000 draws on one core.
func BenchmarkBackward(b *testing.B) {
	task := benchmarked(b)
	var spent, effective float64
	for b.Loop() {
		d, err := backward.Run(context.Background(), task)
		if err != nil {
			b.Fatal(err)
		}
		spent, effective = float64(d.Quality.Evaluations), d.Quality.EffectiveDraws
	}
	b.ReportMetric(spent, "likelihoods")
	b.ReportMetric(effective, "effective")
}
