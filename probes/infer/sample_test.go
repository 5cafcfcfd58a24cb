package infer

import (
	"context"
	"fmt"
	"math"
	"testing"

	"steelyard/probes/prior"
)

func gaussianProblem(d int) Problem {
	var p Problem
	for j := range d {
		pr, _ := prior.Normal(0, 1)
		p.Free = append(p.Free, Free{Name: fmt.Sprint("x", j), Prior: pr})
	}
	p.Likelihood = func() func([]float64) float64 {
		return func(x []float64) float64 {
			sum := 0.0
			for j, v := range x {
				e := (v - 0.5) / 0.1
				if j > 0 {
					e = (v - x[j-1]) / 0.1
				}
				sum += e * e
			}
			return -sum / 2
		}
	}
	return p
}

// One dimension is conjugate: the evidence is N(½; 0, 1 + σ²) · √(2π) σ and the
// posterior mean ½/(1 + σ²), with σ = 0.1.
func TestConjugateNormal(t *testing.T) {
	s, err := DrawPosterior(context.Background(), gaussianProblem(1), Options{})
	if err != nil {
		t.Fatal(err)
	}
	if !s.Quality.Converged {
		t.Fatalf("not converged: %v", s.Warnings)
	}
	want := -math.Log(1.01)/2 - 0.25/2/1.01 + math.Log(0.1)
	// 12 000 proposals at an efficiency above a half: 1/√6000 is 0.013.
	if got := s.Quality.LogEvidence; math.Abs(got-want) > 0.04 {
		t.Errorf("ln evidence %.4f, want %.4f", got, want)
	}
	mean := 0.0
	for _, x := range s.Values {
		mean += x[0] / float64(len(s.Values))
	}
	if want := 0.5 / 1.01; math.Abs(mean-want) > 5*0.1/math.Sqrt(s.Quality.EffectiveDraws) {
		t.Errorf("mean %.4f, want %.4f", mean, want)
	}
}
