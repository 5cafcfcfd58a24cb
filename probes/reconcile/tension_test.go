package reconcile

import (
	"encoding/json"
	"math"
	"math/rand/v2"
	"os"
	"testing"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat/distuv"

	"steelyard/probes/infer"
)

type reference struct {
	PToSigma [][2]float64 `json:"p_to_sigma"`
	SigmaToP [][2]float64 `json:"sigma_to_p"`
	Pairs    []struct {
		LnA         float64 `json:"ln_a"`
		SdA         float64 `json:"sd_a"`
		LnB         float64 `json:"ln_b"`
		SdB         float64 `json:"sd_b"`
		Correlation float64 `json:"correlation"`
		Sigma       float64 `json:"sigma"`
	} `json:"lognormal_pairs"`
	Agreement []struct {
		Name        string      `json:"name"`
		X           []float64   `json:"x"`
		Sigma       []float64   `json:"sigma"`
		Correlation [][]float64 `json:"correlation"`
		Chi2        float64     `json:"chi2"`
		Dof         int         `json:"dof"`
		P           float64     `json:"p"`
		TwoSided    float64     `json:"two_sided_sigma"`
	} `json:"agreement"`
}

// readReference reads testdata/statistics/tension.json, which names its source.
func readReference(t *testing.T) reference {
	t.Helper()
	b, err := os.ReadFile("../../testdata/statistics/tension.json")
	if err != nil {
		t.Fatal(err)
	}
	var r reference
	if err := json.Unmarshal(b, &r); err != nil {
		t.Fatal(err)
	}
	return r
}

func TestSigmaAgainstReference(t *testing.T) {
	r := readReference(t)
	for _, row := range r.PToSigma {
		if got := Sigma(row[0]); math.Abs(got/row[1]-1) > 1e-10 {
			t.Errorf("Sigma(%g) = %.15g, want %.15g", row[0], got, row[1])
		}
	}
	for _, row := range r.SigmaToP {
		if got := TwoSided(row[0]); math.Abs(got/row[1]-1) > 1e-10 {
			t.Errorf("TwoSided(%g) = %.15g, want %.15g", row[0], got, row[1])
		}
	}
	// Two-sided p of 13.7σ and 37σ, where 1 − cdf has long been zero; the value by
	// the round trip.
	for _, sigma := range []float64{13.7, 37} {
		if got := Sigma(TwoSided(sigma)); math.Abs(got/sigma-1) > 1e-10 {
			t.Errorf("Sigma(TwoSided(%g)) = %.15g", sigma, got)
		}
	}
}

// For lognormal masses the probability of Raveri & Doux 2021 in ln M has the
// closed form |ln a − ln b|/sd. A significance s from 4000 draws scatters by
// √(1/4000 + s²/8000) from the mean and the width alone; twenty sets of draws
// average to a fifth of that, and three times the average is allowed.
func TestTensionOfLognormals(t *testing.T) {
	for _, row := range readReference(t).Pairs {
		if row.Correlation != 0 {
			continue // independent draws only; sharing has tests of its own
		}
		const sets = 20
		mean := 0.0
		for seed := range uint64(sets) {
			rng := rand.New(rand.NewPCG(seed, 2))
			got, _ := pairSigma(t, placeOf(independentDraws(rng, 4000, []float64{row.LnA, row.LnB}, []float64{row.SdA, row.SdB})))
			mean += got / sets
		}
		tolerance := 3 * math.Sqrt((1/4000.+row.Sigma*row.Sigma/8000)/sets)
		if math.Abs(mean-row.Sigma) > tolerance {
			t.Errorf("ln %g ± %g against %g ± %g: %.3fσ, want %.3f ± %.3f", row.LnA, row.SdA, row.LnB, row.SdB, mean, row.Sigma, tolerance)
		}
	}
}

// 4σ is resolved to ±0.15 (one standard deviation) with 4000 draws, whichever of
// the two estimates is the less certain, and without bias: the mean of 60 sets
// is known to 0.02.
func TestFourSigmaIsResolved(t *testing.T) {
	for _, sd := range [][]float64{{0.1, 0.1}, {0.1, 0.2}, {0.1, 0.5}, {0.1, 0.02}} {
		const sets = 60
		mean, square := 0.0, 0.0
		for seed := range uint64(sets) {
			rng := rand.New(rand.NewPCG(seed, 7))
			got, _ := pairSigma(t, placeOf(independentDraws(rng, 4000, []float64{0, 4 * math.Hypot(sd[0], sd[1])}, sd)))
			mean += got / sets
			square += got * got / sets
		}
		scatter := math.Sqrt(square - mean*mean)
		t.Logf("sd %v: %.3f ± %.3f", sd, mean, scatter)
		if math.Abs(mean-4) > 0.05 || scatter > 0.15 {
			t.Errorf("sd %v: 4σ comes out as %.3f ± %.3f", sd, mean, scatter)
		}
	}
}

// A gamma distribution of shape 64 has a skewness of 0.25 and highest-density
// probabilities that its distribution function gives. The values x where they
// are 3.5σ were found with scipy.stats.gamma (brentq on the probability outside
// equal densities).
func TestSkewedTails(t *testing.T) {
	for _, x := range []float64{95.05308879044603, 39.11741115024751} {
		const sets = 20
		mean := 0.0
		for seed := range uint64(sets) {
			law := distuv.Gamma{Alpha: 64, Beta: 1, Src: rand.NewPCG(seed, 3)}
			draws := make([]float64, 4000)
			for i := range draws {
				draws[i] = law.Rand()
			}
			p, _ := convolve(draws).LessLikely(x)
			mean += Sigma(p) / sets
		}
		// The prior on the bend of a tail holds a skewness of 0.25 back by up to
		// 0.15σ at 3.5σ.
		if math.Abs(mean-3.5) > 0.17 {
			t.Errorf("at %.2f: %.3fσ, want 3.5σ", x, mean)
		}
	}
}

// Far out, normal distributions have normal tails and the fitted tail finds
// their significance; it must say that it was used.
func TestTailBeyondTheDraws(t *testing.T) {
	for _, want := range []float64{6, 10, 20} {
		rng := rand.New(rand.NewPCG(3, 4))
		got, fitted := pairSigma(t, placeOf(independentDraws(rng, 4000, []float64{0, want * math.Hypot(0.1, 0.15)}, []float64{0.1, 0.15})))
		if !fitted {
			t.Errorf("%gσ was read off 4000 draws without a mark", want)
		}
		// The slope of the tail is fitted over one standard deviation at about 4σ.
		if math.Abs(got/want-1) > 0.15 {
			t.Errorf("%gσ came out as %.2f", want, got)
		}
	}
}

// Skewed and bimodal differences have closed highest-density probabilities:
// those of an exponential distribution, e^−x, and of two unit normals.
func TestHighestDensityOfOtherShapes(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 6))
	exponential := make([]float64, 20000)
	for i := range exponential {
		exponential[i] = rng.ExpFloat64()
	}
	d := convolve(exponential)
	for _, x := range []float64{0.5, 1, 2, 4} {
		p, _ := d.LessLikely(x)
		// The kernel of a twentieth of a standard deviation rounds the edge at zero
		// off, which adds about its width to the probability.
		if want := math.Exp(-x); math.Abs(p-want) > 0.03 {
			t.Errorf("exponential at %g: %.4f, want %.4f", x, p, want)
		}
	}
	two := make([]float64, 20000)
	for i := range two {
		two[i] = rng.NormFloat64() + float64(10*(i%2)-5)
	}
	p, _ := convolve(two).LessLikely(0)
	// Between the modes the density is that at 5σ from both; beyond them the same
	// density lies 5σ out: p is 2·Φ(−5)·2/2 + the gap, all below 2e-6, and 20000
	// draws see nothing there.
	if p > 1e-3 {
		t.Errorf("between two modes 5σ away: p = %.2g", p)
	}
}

// Normal estimates have a closed agreement: χ² with K − 1 degrees of freedom.
func TestAgreementAgainstReference(t *testing.T) {
	for _, row := range readReference(t).Agreement {
		if len(row.X) < 3 || row.TwoSided > 4 {
			continue
		}
		cov := mat.NewSymDense(len(row.X), nil)
		for a := range row.X {
			for b := a; b < len(row.X); b++ {
				cov.SetSym(a, b, row.Sigma[a]*row.Sigma[b]*row.Correlation[a][b])
			}
		}
		diagonal := true
		for a := range row.X {
			for b := range a {
				diagonal = diagonal && row.Correlation[a][b] == 0
			}
		}
		rng := rand.New(rand.NewPCG(8, 9))
		place := placeOf(gaussianDraws(rng, 40000, row.X, cov))
		members := make([]int, len(row.X))
		for k := range members {
			members[k] = k
		}
		mean, cov2 := moments(transposed(place.LnMass))
		best, err := BestLinear(mean, cov2)
		if err != nil {
			t.Fatal(err)
		}
		chi2 := best.Chi2
		// 40000 draws know a covariance to 0.7%, and χ² with it.
		if math.Abs(chi2/row.Chi2-1) > 0.03 {
			t.Errorf("%s: χ² = %.4f, want %.4f", row.Name, chi2, row.Chi2)
		}
		if !diagonal {
			continue // correlations reach the density by shared nuisances only
		}
		p, _ := lessLikely(place, members)
		if got := Sigma(p); math.Abs(got-row.TwoSided) > 0.06 {
			t.Errorf("%s: %.3fσ, want %.3fσ", row.Name, got, row.TwoSided)
		}
	}
}

// The tension of three estimates reduces to that of two when the third says
// nothing.
func TestUninformativeEstimateChangesNothing(t *testing.T) {
	rng := rand.New(rand.NewPCG(10, 11))
	ln := independentDraws(rng, 8000, []float64{0, 0.4, 0}, []float64{0.1, 0.12, 20})
	two, _ := pairSigma(t, placeOf(ln[:2]))
	p, _ := lessLikely(placeOf(ln), []int{0, 1, 2})
	// With one more degree of freedom that carries no χ²: p = exp(−χ²/2).
	if want := Sigma(math.Exp(-two * two / 2)); math.Abs(Sigma(p)-want) > 0.06 {
		t.Errorf("%.3fσ, want %.3fσ", Sigma(p), want)
	}
}

// The evidence of one mass over two, each flat over W = ln 10⁴, is W times the
// normal density of their difference at zero; over three, W² times that of two
// differences.
func TestEvidenceOfOneMass(t *testing.T) {
	rng := rand.New(rand.NewPCG(12, 13))
	mean, sd := []float64{0, 0.3, 0.1}, []float64{0.1, 0.15, 0.2}
	for _, k := range []int{2, 3} {
		place := placeOf(independentDraws(rng, 20000, mean[:k], sd[:k]))
		m := matchingOf(place)
		r, err := Compare(m, Limits, infer.NewStream("evidence"))
		if err != nil {
			t.Fatal(err)
		}
		// ∫ Π N(u; x_k, σ_k²) du = N-dimensional normal at its best common value.
		best, err := BestLinear(mean[:k], covariance(sd[:k], nil))
		if err != nil {
			t.Fatal(err)
		}
		want := float64(k-1)*math.Log(math.Log(1e4)) - best.Chi2/2 + math.Log(best.SD) - float64(k-1)/2*math.Log(2*math.Pi)
		for _, s := range sd[:k] {
			want -= math.Log(s)
		}
		// 20000 draws know a mean to 0.7% of its error, χ²/2 to about 0.02.
		if got := r.Consistency[0].LnBayes; math.Abs(got-want) > 0.06 {
			t.Errorf("%d estimates: ln B = %.3f, want %.3f", k, got, want)
		}
	}
}

func TestVerdictWords(t *testing.T) {
	for sigma, want := range map[float64]string{0: "consistent", -1.99: "consistent", 2: "strained", 2.99: "strained", -3: "in tension", 5: "incompatible"} {
		if got := Verdict(sigma, Limits); got != want {
			t.Errorf("Verdict(%g) = %q, want %q", sigma, got, want)
		}
	}
}

func lessLikely(place *Matched, members []int) (float64, bool) {
	residual, common := parts(place, members)
	return newContrastDensity(logDensities(residual), common).lessLikely(residual, common, effort, infer.NewStream("contrasts"))
}

func transposed(x [][]float64) [][]float64 {
	rows := make([][]float64, len(x[0]))
	for i := range rows {
		for _, column := range x {
			rows[i] = append(rows[i], column[i])
		}
	}
	return rows
}
