package lensing

import (
	"context"
	"math"
	"math/rand/v2"
	"os"
	"sort"
	"testing"

	"steelyard/probes/halo"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/mock"
	"steelyard/probes/prior"
)

// slow skips a test of minutes unless it is asked for.
func slow(t *testing.T) {
	t.Helper()
	if os.Getenv("STEELYARD_SLOW") == "" {
		t.Skip("invents and weighs hundreds of catalogues; set STEELYARD_SLOW=1 to run it")
	}
}

// outcome is how one invented catalogue was weighed.
type outcome struct {
	rank   float64 // share of draws of ln M_200c below the truth
	pull   float64 // (mean of ln M_200c − truth) / its standard deviation
	offset float64 // median of ln M_200c − truth
	sd     float64 // of ln M_200c
	cross  float64 // p-value of the cross shear
	rotten bool    // not converged
}

// rehearse weighs n catalogues, each of a truth that draw invents.
func rehearse(t *testing.T, n int, settings method.Settings, draw func(*rand.Rand) (mock.Truth, mock.Shapes)) []outcome {
	out := make([]outcome, n)
	for k := range out {
		rng := rand.New(rand.NewPCG(2008, uint64(k)))
		truth, shapes := draw(rng)
		task := shapeTask(t, truth, truth.Shapes(shapes, rng))
		p, err := reduce(context.Background(), task)
		if err != nil {
			t.Fatal(err)
		}
		data, err := p.MarshalBinary()
		if err != nil {
			t.Fatal(err)
		}
		task.Settings, task.Reduced = settings, map[string][]byte{"profile": data}
		task.Sampling.Stream = infer.NewStream("coverage", string(rune(k)))
		d, err := tangentialShear.Run(context.Background(), task)
		if err != nil {
			t.Fatal(err)
		}
		var below, sum, square float64
		masses := parameter(t, d, "mass_200c")
		for _, m := range masses {
			x := math.Log(m / truth.M200)
			if x < 0 {
				below++
			}
			sum += x
			square += x * x
		}
		n := float64(len(masses))
		sd := math.Sqrt(square/n - sum/n*sum/n)
		out[k] = outcome{
			rank: below / n, pull: sum / n / sd, sd: sd, rotten: !d.Quality.Converged,
			offset: math.Log(infer.Percentiles(masses, 50)[0] / truth.M200), cross: find(t, d, "cross shear").PValue,
		}
	}
	return out
}

// uniform returns the Kolmogorov–Smirnov p-value of values against a uniform
// distribution (asymptotic, with Stephens' 1970 correction).
func uniform(values []float64) float64 {
	v := append([]float64(nil), values...)
	sort.Float64s(v)
	d, n := 0.0, float64(len(v))
	for i, x := range v {
		d = max(d, x-float64(i)/n, float64(i+1)/n-x)
	}
	l := (math.Sqrt(n) + 0.12 + 0.11/math.Sqrt(n)) * d
	p := 0.0
	for k := 1; k < 100; k++ {
		p += 2 * math.Pow(-1, float64(k-1)) * math.Exp(-2*float64(k*k)*l*l)
	}
	return min(max(p, 0), 1)
}

// TestCoverage weighs 400 catalogues whose mass, concentration, calibration
// and elongation are drawn from the priors of the analysis: the intervals must
// hold the truth as often as they say, and the cross shear must be noise.
func TestCoverage(t *testing.T) {
	slow(t)
	const n = 400
	settings := defaults(tangentialShear)
	mass, err := prior.LogUniform(2e14, 3e15)
	settings["mass"] = method.Distributed(mass, err)
	bias, err := prior.Normal(0, 0.03)
	settings["shear_bias"] = method.Distributed(bias, err)
	elongation, err := prior.LogNormal(1, 0.1)
	settings["elongation"] = method.Distributed(elongation, err)
	relation, ok := halo.FindRelation("duffy-2008")
	if !ok {
		t.Fatal("no relation")
	}
	c := background(t)
	out := rehearse(t, n, settings, func(rng *rand.Rand) (mock.Truth, mock.Shapes) {
		truth, shapes := curlew, deep
		truth.RA, truth.Dec = 2*math.Pi*rng.Float64(), math.Asin(2*rng.Float64()-1)
		truth.M200 = mass.FromScore(rng.NormFloat64())
		truth.C200 = relation.Concentration(truth.M200, truth.Redshift, c) * math.Exp(relation.Scatter*rng.NormFloat64())
		shapes.ShearBias = bias.FromScore(rng.NormFloat64())
		shapes.Elongation = elongation.FromScore(rng.NormFloat64())
		return truth, shapes
	})
	report(t, out)
}

// TestBiasAtOneHalo weighs one fixed halo, on the relation that its
// concentration is assumed to scatter about: on the mean the mass is right.
func TestBiasAtOneHalo(t *testing.T) {
	slow(t)
	relation, ok := halo.FindRelation("duffy-2008")
	if !ok {
		t.Fatal("no relation")
	}
	truth := curlew
	truth.C200 = relation.Concentration(truth.M200, truth.Redshift, background(t))
	out := rehearse(t, 200, defaults(tangentialShear), func(*rand.Rand) (mock.Truth, mock.Shapes) { return truth, deep })
	var bias, sd, inside float64
	for _, o := range out {
		bias += o.offset / float64(len(out))
		sd += o.sd / float64(len(out))
		if o.rank > 0.16 && o.rank < 0.84 {
			inside += 1 / float64(len(out))
		}
	}
	t.Logf("M_200c = %.1e, c = %.2f: mean bias of ln M %.4f, typical error %.3f, coverage of 68%% intervals %.3f", truth.M200, truth.C200, bias, sd, inside)
	if math.Abs(bias) > sd/5 {
		t.Errorf("a bias of %.4f in ln M with a typical error of %.3f", bias, sd)
	}
}

func report(t *testing.T, out []outcome) {
	t.Helper()
	n := float64(len(out))
	var ranks, cross []float64
	var inside, inside95, bias, sd, pull, rotten float64
	for _, o := range out {
		ranks, cross = append(ranks, o.rank), append(cross, o.cross)
		if o.rank > 0.16 && o.rank < 0.84 {
			inside++
		}
		if o.rank > 0.025 && o.rank < 0.975 {
			inside95++
		}
		bias += o.offset / n
		sd += o.sd / n
		pull += o.pull / n
		if o.rotten {
			rotten++
		}
	}
	t.Logf("%g catalogues: coverage of 68%% intervals %.3f ± %.3f, of 95%% intervals %.3f; ranks uniform p = %.3f; cross-shear p-values uniform p = %.3f",
		n, inside/n, math.Sqrt(0.68*0.32/n), inside95/n, uniform(ranks), uniform(cross))
	t.Logf("mean bias of ln M %.4f (%.2f of its error), typical error %.3f; %g not converged", bias, pull, sd, rotten)
	if d := math.Abs(inside/n - 0.68); d > 3*math.Sqrt(0.68*0.32/n) {
		t.Errorf("the 68%% interval holds the truth in %.1f%%", 100*inside/n)
	}
	if d := math.Abs(inside95/n - 0.95); d > 3*math.Sqrt(0.95*0.05/n) {
		t.Errorf("the 95%% interval holds the truth in %.1f%%", 100*inside95/n)
	}
	// Fixed seeds: a failure at p = 0.001 is no accident.
	if p := uniform(ranks); p < 1e-3 {
		t.Errorf("the ranks are not uniform: p = %.2g", p)
	}
	if p := uniform(cross); p < 1e-3 {
		t.Errorf("the p-values of the cross shear are not uniform: p = %.2g", p)
	}
	if math.Abs(pull) > 0.2+3/math.Sqrt(n) {
		t.Errorf("the mean of ln M is off by %.2f of its error", pull)
	}
	if rotten > 0.02*n {
		t.Errorf("%g of %g did not converge", rotten, n)
	}
}
