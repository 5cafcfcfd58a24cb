package reconcile

import (
	"encoding/json"
	"math"
	"math/rand/v2"
	"os"
	"sort"
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

// gaussianDraws draws n joint values of ln M with the given means and covariance.
func gaussianDraws(rng *rand.Rand, n int, mean []float64, cov *mat.SymDense) [][]float64 {
	var chol mat.Cholesky
	if !chol.Factorize(cov) {
		panic("covariance")
	}
	root := mat.NewTriDense(len(mean), mat.Lower, nil)
	chol.LTo(root)
	out := make([][]float64, len(mean))
	for k := range out {
		out[k] = make([]float64, n)
	}
	for i := range n {
		z := mat.NewVecDense(len(mean), normals(rng, len(mean)))
		var x mat.VecDense
		x.MulVec(root, z)
		for k := range mean {
			out[k][i] = mean[k] + x.AtVec(k)
		}
	}
	return out
}

func independentDraws(rng *rand.Rand, n int, mean, sd []float64) [][]float64 {
	cov := mat.NewSymDense(len(mean), nil)
	for k := range mean {
		cov.SetSym(k, k, sd[k]*sd[k])
	}
	return gaussianDraws(rng, n, mean, cov)
}

func placeOf(ln [][]float64) *Matched {
	m := &Matched{At: At{Radius: 1000}, LnMass: ln, Common: make([][]float64, len(ln))}
	for range ln {
		m.Marks = append(m.Marks, Mark{Name: "an estimate"})
	}
	return m
}

func pairSigma(t *testing.T, m *Matched) (float64, bool) {
	t.Helper()
	p, err := difference(m, 0, 1)
	if err != nil {
		t.Fatal(err)
	}
	prob, fitted := p.density.LessLikely(0)
	return Sigma(prob), fitted
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

// Under agreement p must be uniform. Each set has its own data: the estimates'
// means scatter about one truth by their errors.
func TestPIsUniformUnderAgreement(t *testing.T) {
	const draws = 500
	for _, k := range []int{2, 3} {
		sets := 2000
		if k == 3 && os.Getenv("STEELYARD_SLOW") == "" {
			sets = 400 // each costs a multidimensional density
		}
		sd := []float64{0.1, 0.2, 0.15}[:k]
		values := make([]float64, sets)
		for s := range values {
			rng := rand.New(rand.NewPCG(uint64(s), uint64(k)))
			mean := make([]float64, k)
			for j := range mean {
				mean[j] = sd[j] * rng.NormFloat64()
			}
			place := placeOf(independentDraws(rng, draws, mean, sd))
			var pairs []*pair
			members := []int{0, 1, 2}[:k]
			p, err := difference(place, 0, 1)
			if err != nil {
				t.Fatal(err)
			}
			c, err := agreement(place, members, append(pairs, p), Limits, infer.NewStream("agreement"))
			if err != nil {
				t.Fatal(err)
			}
			values[s] = c.P
		}
		checkUniform(t, values)
	}
}

// checkUniform holds the Kolmogorov–Smirnov distance below 1.95/√n, which one
// set in a thousand exceeds by chance, plus what 500 draws blur: 1/√500 of a
// standard deviation in the mean, 0.01 in p.
func checkUniform(t *testing.T, p []float64) {
	t.Helper()
	sort.Float64s(p)
	distance := 0.0
	for i, v := range p {
		distance = math.Max(distance, math.Abs(v-(float64(i)+0.5)/float64(len(p))))
	}
	if limit := 1.95/math.Sqrt(float64(len(p))) + 0.01; distance > limit {
		t.Errorf("p is not uniform: Kolmogorov–Smirnov distance %.4f above %.4f", distance, limit)
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
		chi2, err := chiSquare(place, members)
		if err != nil {
			t.Fatal(err)
		}
		// 40000 draws know a covariance to 0.7%, and χ² with it.
		if math.Abs(chi2/row.Chi2-1) > 0.03 {
			t.Errorf("%s: χ² = %.4f, want %.4f", row.Name, chi2, row.Chi2)
		}
		if !diagonal {
			continue // correlations reach the density by shared nuisances only
		}
		p, _ := contrastsLessLikely(place, members, infer.NewStream("x"))
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
	p, _ := contrastsLessLikely(placeOf(ln), []int{0, 1, 2}, infer.NewStream("y"))
	// With one more degree of freedom that carries no χ²: p = exp(−χ²/2).
	if want := Sigma(math.Exp(-two * two / 2)); math.Abs(Sigma(p)-want) > 0.06 {
		t.Errorf("%.3fσ, want %.3fσ", Sigma(p), want)
	}
}

func TestVerdictWords(t *testing.T) {
	for sigma, want := range map[float64]string{0: "consistent", -1.99: "consistent", 2: "strained", 2.99: "strained", -3: "in tension", 5: "incompatible"} {
		if got := Verdict(sigma, Limits); got != want {
			t.Errorf("Verdict(%g) = %q, want %q", sigma, got, want)
		}
	}
}
