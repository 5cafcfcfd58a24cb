package prior

import (
	"encoding/json"
	"math"
	"os"
	"testing"

	"pgregory.net/rapid"
)

func build(kind string, a []float64) (Prior, error) {
	switch kind {
	case "normal":
		return Normal(a[0], a[1])
	case "half_normal":
		return HalfNormal(a[0])
	case "lognormal":
		return LogNormal(a[0], a[1])
	case "uniform":
		return Uniform(a[0], a[1])
	case "loguniform":
		return LogUniform(a[0], a[1])
	}
	return TwoPiece(a[0], a[1], a[2])
}

func near(got, want, relative, absolute float64) bool {
	return got == want || math.Abs(got-want) <= absolute || math.Abs(got-want) <= relative*math.Abs(want)
}

// testdata/distributions.json names its source. Values are compared to 1e-12 of
// themselves, far inside both tails: nothing there is the difference of two
// large numbers.
func TestAgainstReference(t *testing.T) {
	data, err := os.ReadFile("testdata/distributions.json")
	if err != nil {
		t.Fatal(err)
	}
	var file struct {
		Cases []struct {
			Kind     string    `json:"kind"`
			Args     []float64 `json:"args"`
			Mean, SD float64
			Points   []struct {
				Score, X, CDF float64
				LnDensity     float64 `json:"ln_density"`
			}
		}
	}
	if err := json.Unmarshal(data, &file); err != nil {
		t.Fatal(err)
	}
	if len(file.Cases) != 7 {
		t.Fatalf("%d cases", len(file.Cases))
	}
	for _, c := range file.Cases {
		p, err := build(c.Kind, c.Args)
		if err != nil {
			t.Fatal(err)
		}
		if !near(p.Mean(), c.Mean, 1e-12, 1e-16) || !near(p.SD(), c.SD, 1e-12, 0) {
			t.Errorf("%v: mean %v and sd %v, want %v and %v", p, p.Mean(), p.SD(), c.Mean, c.SD)
		}
		for _, q := range c.Points {
			if got := p.FromScore(q.Score); !near(got, q.X, 1e-12, 0) {
				t.Errorf("%v at score %g: %v, want %v", p, q.Score, got, q.X)
			}
			// x itself is rounded; where the support ends at a number other than
			// zero, the score and the CDF cannot know more than that rounding.
			lo, hi := p.Support()
			gap := min(math.Abs(q.X-lo), math.Abs(hi-q.X))
			lost := 4e-16 * math.Abs(q.X) / gap
			if p.Kind == NormalKind || p.Kind == LogNormalKind || math.IsNaN(lost) {
				lost = 1e-13
			}
			if lost > 1e-3 {
				continue
			}
			if got := p.Score(q.X); !near(got, q.Score, 1e-12+lost, 1e-12) {
				t.Errorf("%v: score of %v is %v, want %v", p, q.X, got, q.Score)
			}
			if got := p.CDF(q.X); !near(got, q.CDF, 1e-11+10*lost, 0) {
				t.Errorf("%v: CDF at %v is %v, want %v", p, q.X, got, q.CDF)
			}
			if got := p.LogDensity(q.X); !near(got, q.LnDensity, 1e-12, 1e-12) {
				t.Errorf("%v: ln density at %v is %v, want %v", p, q.X, got, q.LnDensity)
			}
		}
	}
}

// The distance to a limit keeps its digits: Φ(−8) = 6.220960574271785e-16 and
// Φ(−37) = 5.725571222524e-300 (scipy.special.ndtr).
func TestTailsDoNotCancel(t *testing.T) {
	u := must(Uniform(0, 1))
	for s, want := range map[float64]float64{-8: 6.220960574271785e-16, -37: 5.725571222524577e-300} {
		if got := u.FromScore(s); !near(got, want, 1e-12, 0) {
			t.Errorf("uniform(0, 1) at %g: %g, want %g", s, got, want)
		}
		if got := u.Score(want); !near(got, s, 1e-13, 0) {
			t.Errorf("score of %g is %g, want %g", want, got, s)
		}
	}
	if x := must(Uniform(-1, 0)).FromScore(8); !near(x, -6.220960574271785e-16, 1e-12, 0) {
		t.Errorf("uniform(-1, 0) at 8: %g", x)
	}
	// The width of this prior overflows.
	if x := must(Uniform(-math.MaxFloat64, math.MaxFloat64)).FromScore(0); x != 0 {
		t.Errorf("median of the widest uniform: %g", x)
	}
}

// The percentiles of a two-piece normal are those stated, to the letter.
func TestTwoPiecePercentiles(t *testing.T) {
	p := must(TwoPiece(6.1, 0.8, 0.9))
	for q, want := range map[float64]float64{0.16: 5.3, 0.5: 6.1, 0.84: 7.0} {
		if got := p.Quantile(q); !near(got, want, 1e-14, 0) {
			t.Errorf("percentile %g: %v, want %v", 100*q, got, want)
		}
		if got := p.CDF(want); !near(got, q, 1e-14, 0) {
			t.Errorf("CDF at %g: %v, want %v", want, got, q)
		}
	}
	// One standard deviation reaches 1/0.99446 as far as the percentile.
	if got, want := p.FromScore(1), 6.1+0.9/0.994457883209753; !near(got, want, 1e-14, 0) {
		t.Errorf("at score 1: %v, want %v", got, want)
	}
	// Moments by the midpoint rule over the score.
	mean, square, n := 0.0, 0.0, 400000
	for i := range n {
		x := p.Quantile((float64(i) + 0.5) / float64(n))
		mean += x / float64(n)
		square += (x - 6.1) * (x - 6.1) / float64(n)
	}
	// The rule misses the last 1e-6 of either tail, 25 sd² of it: 3e-5.
	if sd := math.Sqrt(square - (mean-6.1)*(mean-6.1)); !near(p.Mean(), mean, 1e-6, 0) || !near(p.SD(), sd, 1e-4, 0) {
		t.Errorf("mean %v and sd %v, by quadrature %v and %v", p.Mean(), p.SD(), mean, sd)
	}
}

// The density is the derivative of the distribution function.
func TestDensityIntegratesToTheCDF(t *testing.T) {
	for _, p := range []Prior{
		must(Normal(1, 0.2)), must(HalfNormal(0.3)), must(LogNormal(4.5, 0.3)), must(Uniform(-0.5, 0.5)), must(LogUniform(1, 50)), must(TwoPiece(6.1, 0.8, 0.9)),
	} {
		from, to := p.Quantile(0.1), p.Quantile(0.45)
		sum, n := 0.0, 20000
		for i := range n {
			sum += math.Exp(p.LogDensity(from+(to-from)*(float64(i)+0.5)/float64(n))) * (to - from) / float64(n)
		}
		// The midpoint rule errs by the second derivative over n², below 1e-7.
		if !near(sum, 0.35, 1e-7, 0) {
			t.Errorf("%v: the density holds %v between its 10th and 45th percentiles", p, sum)
		}
	}
}

func anyPrior(t *rapid.T) Prior {
	positive := rapid.Float64Range(1e-6, 1e6)
	a, b, c := rapid.Float64Range(-1e6, 1e6).Draw(t, "a"), positive.Draw(t, "b"), positive.Draw(t, "c")
	switch rapid.IntRange(0, 5).Draw(t, "kind") {
	case 0:
		return must(Normal(a, b))
	case 1:
		return must(HalfNormal(b))
	case 2:
		return must(LogNormal(b, rapid.Float64Range(1e-3, 3).Draw(t, "sd")))
	case 3:
		return must(Uniform(a, a+b))
	case 4:
		return must(LogUniform(b, b*(1+c)))
	}
	return must(TwoPiece(a, b, c))
}

// Score undoes FromScore as far as the value can carry the score: a value is
// rounded to 2⁻⁵³ of itself, which moves the score by that over the slope.
func TestRoundTrip(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p, s := anyPrior(t), rapid.Float64Range(-6, 6).Draw(t, "s")
		x := p.FromScore(s)
		lo, hi := p.Support()
		if !(lo <= x && x <= hi) {
			t.Fatalf("%v at %g is %g, outside its support", p, s, x)
		}
		if x == lo || x == hi {
			if !math.IsInf(p.Score(x), 0) {
				t.Fatalf("%v: the end of the support has score %g", p, p.Score(x))
			}
			return
		}
		// dx/ds = φ(s)/f(x), on the denser side where a two-piece normal has its
		// step; a few roundings of x, of the arguments and of s.
		density := max(p.LogDensity(x), p.LogDensity(math.Nextafter(x, math.Inf(1))))
		slope := math.Exp(-s*s/2-math.Log(2*math.Pi)/2) / math.Exp(density)
		size := max(math.Abs(x), math.Abs(p.A))
		if back := p.Score(x); math.Abs(back-s) > 1e-12+1e-15*size/slope {
			t.Fatalf("%v: score %v came back as %v", p, s, back)
		}
	})
}

// Values rise with the score, but for the rounding where the halves computed from
// either end join: a few units in the last place, times the logarithm of the
// limits' ratio, up to 28 here, for a log-uniform.
func TestScoresRise(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		p := anyPrior(t)
		a, b := rapid.Float64Range(-36, 36).Draw(t, "s"), rapid.Float64Range(-36, 36).Draw(t, "t")
		if a > b {
			a, b = b, a
		}
		if low, high := p.FromScore(a), p.FromScore(b); low > high+1e-14*math.Abs(high) {
			t.Fatalf("%v falls from %g at %g to %g at %g", p, p.FromScore(a), a, p.FromScore(b), b)
		}
	})
}

func TestOutsideTheSupport(t *testing.T) {
	u := must(LogUniform(2, 3))
	inf := math.Inf(1)
	for _, c := range []struct{ x, score, cdf, density float64 }{{1, -inf, 0, -inf}, {-1, -inf, 0, -inf}, {4, inf, 1, -inf}, {2, -inf, 0, u.LogDensity(2)}} {
		if u.Score(c.x) != c.score || u.CDF(c.x) != c.cdf || u.LogDensity(c.x) != c.density {
			t.Errorf("at %g: score %g, CDF %g, ln density %g", c.x, u.Score(c.x), u.CDF(c.x), u.LogDensity(c.x))
		}
	}
	if !math.IsNaN(u.Score(math.NaN())) || !math.IsNaN(u.Quantile(-0.1)) || !math.IsNaN(u.Quantile(1.1)) || !math.IsNaN(u.Quantile(math.NaN())) {
		t.Error("NaN and impossible fractions must give NaN")
	}
	if u.Quantile(0) != 2 || u.Quantile(1) != 3 {
		t.Errorf("the ends are %g and %g", u.Quantile(0), u.Quantile(1))
	}
	if l := must(LogNormal(1, 1)).LogDensity(0); l != -inf {
		t.Errorf("lognormal at zero: %g", l)
	}
}

func TestExact(t *testing.T) {
	p := Exact(0.3)
	if p.FromScore(5) != 0.3 || p.Score(0.3) != 0 || p.SD() != 0 || p.Mean() != 0.3 || p.Median() != 0.3 || p.Quantile(0.2) != 0.3 {
		t.Error("an exact number is not the same everywhere")
	}
	if !math.IsInf(p.Score(0.2), -1) || !math.IsInf(p.Score(0.4), 1) || p.CDF(0.2) != 0 || p.CDF(0.4) != 1 {
		t.Error("an exact number has scores beside itself")
	}
}

func TestString(t *testing.T) {
	for want, p := range map[string]Prior{
		"0.3": Exact(0.3), "normal(1, 0.04)": must(Normal(1, 0.04)), "half_normal(0.1)": must(HalfNormal(0.1)),
		"lognormal(4.5, 0.3)": must(LogNormal(4.5, 0.3)), "uniform(-0.5, 0.5)": must(Uniform(-0.5, 0.5)),
		"loguniform(1e+12, 1e+16)": must(LogUniform(1e12, 1e16)), "6.1 +0.9 -0.8": must(TwoPiece(6.1, 0.8, 0.9)),
	} {
		if got := p.String(); got != want {
			t.Errorf("%q, want %q", got, want)
		}
	}
}

func TestImpossibleArguments(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	for _, c := range []struct {
		kind string
		args []float64
	}{
		{"normal", []float64{0, 0}}, {"normal", []float64{0, -1}}, {"normal", []float64{nan, 1}}, {"normal", []float64{0, inf}},
		{"half_normal", []float64{0}}, {"lognormal", []float64{0, 1}}, {"lognormal", []float64{1, 0}}, {"uniform", []float64{1, 1}},
		{"uniform", []float64{2, 1}}, {"uniform", []float64{-inf, 1}}, {"loguniform", []float64{0, 1}}, {"loguniform", []float64{2, 1}},
		{"two-piece", []float64{1, 0, 1}}, {"two-piece", []float64{1, 1, -1}},
	} {
		if p, err := build(c.kind, c.args); err == nil {
			t.Errorf("%s%v was accepted as %v", c.kind, c.args, p)
		}
	}
}

func must(p Prior, err error) Prior {
	if err != nil {
		panic(err)
	}
	return p
}
