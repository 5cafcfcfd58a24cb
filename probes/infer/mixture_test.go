package infer

import (
	"math"
	"testing"
)

func someMixture() *mixture {
	return newMixture(2, 0.1, []float64{1, 2}, []part{
		newPart([]float64{1, -1}, []float64{0.5, 0, 0.3, 0.2}, 1),
		newPart([]float64{-2, 0.5}, []float64{0.3, 0, -0.1, 0.6}, 4),
	})
}

// The density integrates to one: by the midpoint rule in the coordinates
// x = tan u, which reach the far tails.
func TestMixtureDensityIntegratesToOne(t *testing.T) {
	m := someMixture()
	const n = 1500
	sum := 0.0
	line := make([][]float64, n)
	for i := range n {
		x := math.Tan(math.Pi * ((float64(i)+0.5)/n - 0.5))
		for j := range n {
			line[j] = []float64{x, math.Tan(math.Pi * ((float64(j)+0.5)/n - 0.5))}
		}
		for j, l := range m.lnDensity(line) {
			y := line[j][1]
			sum += math.Exp(l) * (1 + x*x) * (1 + y*y) * math.Pi * math.Pi / n / n
		}
	}
	// A tail of two degrees of freedom in two dimensions falls as r⁻⁴; the
	// midpoint rule errs by some 1e-4 there.
	if math.Abs(sum-1) > 1e-3 {
		t.Errorf("the density integrates to %v", sum)
	}
}

// Proposals follow the density: importance weights from the mixture to the prior
// average to one, and the mean under them is the prior's.
func TestMixtureDrawsFollowItsDensity(t *testing.T) {
	m := someMixture()
	const n = 200000
	z := m.draw(n, NewStream("mixture"))
	sum, square, mean := 0.0, 0.0, 0.0
	for i, l := range m.lnDensity(z) {
		w := math.Exp(lnUnitNormal(z[i]) - l)
		sum += w / n
		square += w * w / n
		mean += w * z[i][0] / n
	}
	sd := math.Sqrt((square - 1) / n)
	if math.Abs(sum-1) > 5*sd {
		t.Errorf("weights average to %.4f ± %.4f", sum, sd)
	}
	// Weights are at most ten, the share of the prior being a tenth.
	if math.Abs(mean) > 5*math.Sqrt(10.0/n) {
		t.Errorf("the prior's mean comes out as %.4f", mean)
	}
}

func TestChiSquareDraws(t *testing.T) {
	rng := NewStream("chi square").Rand(0)
	const n = 100000
	for _, dof := range dofs {
		mean, below := 0.0, 0.0
		median := chiSquareMedian(dof)
		for range n {
			x := chiSquare(rng, dof)
			mean += x / n
			if x < median {
				below++
			}
		}
		if math.Abs(mean-dof) > 5*math.Sqrt(2*dof/n) {
			t.Errorf("%g degrees of freedom: mean %g", dof, mean)
		}
		if math.Abs(below/n-0.5) > 5*0.5/math.Sqrt(n) {
			t.Errorf("%g degrees of freedom: %.4f lie below the median", dof, below/n)
		}
	}
}

// chiSquareMedian solves Q(dof/2, x/2) = ½ by bisection.
func chiSquareMedian(dof float64) float64 {
	lo, hi := 0.0, 10*dof
	for range 100 {
		if mid := (lo + hi) / 2; ChiSquareP(mid, int(dof)) > 0.5 {
			lo = mid
		} else {
			hi = mid
		}
	}
	return lo
}

func TestResample(t *testing.T) {
	w := []float64{0.5, 0, 0.25, 0.2, 0.05}
	rng := NewStream("resample").Rand(0)
	const n = 10
	total := make([]float64, len(w))
	square := make([]float64, len(w))
	const times = 20000
	var squares []float64
	for range times {
		var picks []int
		picks, squares = resample(w, n, rng)
		if len(picks) != n {
			t.Fatalf("%d picks", len(picks))
		}
		counts := make([]float64, len(w))
		for _, p := range picks {
			counts[p]++
		}
		for i, c := range counts {
			if c < math.Floor(n*w[i]) || c > math.Ceil(n*w[i]) {
				t.Fatalf("weight %g was picked %g times of %d", w[i], c, n)
			}
			total[i] += c / n / times
			square[i] += c * c / n / n / times
		}
	}
	for i := range w {
		// A count is one of two neighbours, so its sd is at most ½.
		if tol := 5 * 0.5 / n / math.Sqrt(times); math.Abs(total[i]-w[i]) > tol {
			t.Errorf("weight %g is picked at %.4f", w[i], total[i])
		}
		if math.Abs(square[i]-squares[i]) > 5*0.1/math.Sqrt(times) {
			t.Errorf("weight %g: mean squared share %.5f, said to be %.5f", w[i], square[i], squares[i])
		}
	}
}

// What draws are worth is checked against what it means: the scatter of their
// percentiles over many repetitions, weights uneven on purpose.
func TestEffectiveDrawsPredictScatter(t *testing.T) {
	const m, n, times = 600, 200, 3000
	rng := NewStream("worth").Rand(0)
	scatter, worth := 0.0, 0.0
	for range times {
		// Proposals of twice the width of the unit normal they stand for.
		z, lnW := rows(m, 1), make([]float64, m)
		for i := range z {
			z[i][0] = 2 * rng.NormFloat64()
			lnW[i] = -z[i][0] * z[i][0] / 2 * (1 - 0.25)
		}
		w, _ := normalised(lnW)
		picks, squares := resample(w, n, rng)
		worth += effectiveDraws(z, w, squares) / times
		below := 0.0
		for _, p := range picks {
			if z[p][0] < 0 {
				below++
			}
		}
		scatter += (below/n - 0.5) * (below/n - 0.5) / times
	}
	// The scatter of the median alone; the worst of five percentiles is worth no
	// more than it, and here, with even shares everywhere, not much less.
	median := 0.25 / scatter
	if worth > 1.1*median || worth < 0.5*median {
		t.Errorf("draws said to be worth %.0f scatter like %.0f", worth, median)
	}
}

// The starts fill the prior evenly: close to half lie below the median of every
// parameter.
func TestStartsAreEven(t *testing.T) {
	for _, dim := range []int{1, 2, 4, 12} {
		z := starts(fewStarts, dim, NewStream("starts").Rand(0))
		for j := range dim {
			below := 0
			for i := range z {
				if z[i][j] < 0 {
					below++
				}
			}
			// Random points would miss 24–40 one time in twenty.
			if below < 24 || below > 40 {
				t.Errorf("%d-d: %d of %d starts lie below the median of parameter %d", dim, below, fewStarts, j+1)
			}
		}
	}
}

func TestClimbReachesTheTop(t *testing.T) {
	for _, k := range []known{gaussian(4, 0.1, 0.9), gaussian(4, 0.01, 1000), gaussian(12, 0.3, 0.5), narrow(3)} {
		target, err := newTarget(k.problem, 1)
		if err != nil {
			t.Fatal(err)
		}
		z, logp, err := survey(t.Context(), target, NewStream("climb").Rand(0))
		if err != nil {
			t.Fatal(err)
		}
		modes, err := findModes(t.Context(), target, z, logp)
		if err != nil {
			t.Fatal(err)
		}
		if settled(modes) != 1 {
			t.Errorf("%s: %d modes", k.name, settled(modes))
		}
		// A Gaussian's Laplace approximation is exact: the curvature is right when
		// the mass is. 0.05 in ln Z stands for the finite differences
		// and, for narrow, the bend of the uniform prior's score.
		if got := modes[0].lnMass(); math.Abs(got-k.lnZ) > 0.05 {
			t.Errorf("%s: Laplace evidence %.3f, want %.3f", k.name, got, k.lnZ)
		}
		t.Logf("%s: %d evaluations", k.name, target.spent)
	}
}
