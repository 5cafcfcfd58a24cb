package dynamics

import (
	"bytes"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"testing"

	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/mock"
	"steelyard/probes/prior"
)

// fitted prepares the posterior of a catalogue.
func fitted(t testing.TB, c *mock.MotionCatalogue, members string, set method.Settings) *jeansFit {
	t.Helper()
	task := weighing(t, invented, tableOf(c), members)
	if _, err := reduced(t, task); err != nil {
		t.Fatal(err)
	}
	task.Settings = method.Settings{}
	for _, s := range jeans.Settings {
		task.Settings[s.Name] = s.Default
	}
	for name, v := range set {
		task.Settings[name] = v
	}
	s, err := readSample(task)
	if err != nil {
		t.Fatal(err)
	}
	f, err := newJeansFit(withField(task, s), s)
	if err != nil {
		t.Fatal(err)
	}
	return f
}

// The density of a galaxy over the annulus and over velocity adds up to one,
// field and all, with and without an elongation.
func TestPhaseSpaceDensityIsNormalised(t *testing.T) {
	c := invented.Motions(mock.Motions{Members: 40, Radius: within(invented, 1)}, rand.New(rand.NewPCG(1, 2)))
	for _, e := range []float64{1, 1.3} {
		f := fitted(t, c, "given", method.Settings{
			"mass": method.Exactly(8e14), "concentration": method.Exactly(4), "anisotropy": method.Exactly(0.3),
			"tracer_concentration": method.Exactly(3), "interloper_fraction": method.Exactly(0.2), "elongation": method.Exactly(e),
		})
		const limit, rings, speeds = 4000.0, 60, 160
		d := &f.data
		sum := 0.0
		for i := range rings {
			// Rings even in √R, which takes out the cusp.
			x := (float64(i) + 0.5) / rings
			R := d.to * x * x
			ring := 2 * math.Pi * R * d.to * 2 * x / rings
			f.data = phaseSpace{lnR: []float64{math.Log(R)}, velocity: []float64{0}, noise: []float64{40 * 40}, limit: []float64{limit}, to: d.to}
			density := f.likelihood()
			for k := range speeds {
				f.data.velocity[0] = limit * (2*(float64(k)+0.5)/speeds - 1)
				sum += math.Exp(density([]float64{0})) / (d.to * d.to * 1e3) * ring * 2 * limit / speeds
			}
		}
		near(t, fmt.Sprintf("∫p dR dv at elongation %g", e), sum, 1, 3e-3) // the rings' error at the centre
	}
}

// Masses from invented galaxies in equilibrium lie within the error that the
// fit states: for the average of a few, within four of its standard errors.
func TestJeansRecovers(t *testing.T) {
	for _, o := range []string{"constant", "rising"} {
		const mocks = 2
		pull := 0.0
		for k := range uint64(mocks) {
			c := invented.Motions(mock.Motions{Members: 100, Field: 10, Radius: within(invented, 1.5), Window: 4000, RedshiftError: 2e-4, Reach: 20}, rand.New(rand.NewPCG(k, 41)))
			task := weighing(t, invented, tableOf(c), "shifting-gapper")
			if _, err := reduced(t, task); err != nil {
				t.Fatal(err)
			}
			d, err := weigh(t, task, jeans, method.Settings{"intrinsic_scatter": method.Exactly(0), "orbits": method.Word(o)})
			if err != nil {
				t.Fatal(err)
			}
			if !d.Quality.Converged {
				t.Errorf("not converged: %v", d.Warnings)
			}
			p := infer.Percentiles(d.Parameter("mass_200c").Values, 16, 50, 84)
			pull += math.Log(p[1]/invented.M200) / (math.Log(p[2]/p[0]) / 2)
		}
		between(t, o+" orbits: mean pull", pull/mocks, -4/math.Sqrt(mocks), 4/math.Sqrt(mocks))
	}
}

// The named assumptions do to the mass what is documented: M ∝ b⁻² at fixed
// radius, and a halo seen end-on weighs less.
func TestJeansAssumptions(t *testing.T) {
	c := invented.Motions(mock.Motions{Members: 200, Radius: within(invented, 1), Reach: 20}, rand.New(rand.NewPCG(6, 41)))
	task := weighing(t, invented, tableOf(c), "given")
	if _, err := reduced(t, task); err != nil {
		t.Fatal(err)
	}
	inside := func(set method.Settings) float64 {
		base := method.Settings{"intrinsic_scatter": method.Exactly(0), "anisotropy": method.Exactly(0)}
		for k, v := range set {
			base[k] = v
		}
		d, err := weigh(t, task, jeans, base)
		if err != nil {
			t.Fatal(err)
		}
		values, ok := d.LnMassesAt(math.Log(1000))
		if !ok {
			t.Fatal("no mass inside 1 Mpc")
		}
		return infer.Percentiles(values, 50)[0]
	}
	plain := inside(nil)
	// Of ln M the errors of the medians of 1000 draws are about 0.005 each; the
	// concentration's prior does not scale along, which leaves a little more.
	between(t, "ln M ratio for b = 0.9", inside(method.Settings{"velocity_bias": method.Exactly(0.9)})-plain, -2*math.Log(0.9)-0.03, -2*math.Log(0.9)+0.03)
	between(t, "ln M ratio for elongation 1.2", inside(method.Settings{"elongation": method.Exactly(1.2)})-plain, -1.8*math.Log(1.2), -1.0*math.Log(1.2))
	between(t, "ln M ratio for radial orbits", inside(method.Settings{"orbits": method.Word("osipkov-merritt"), "anisotropy_radius": method.Exactly(1e6)})-plain, -0.02, 0.02)
}

// A sample of which half of the outer galaxies is lost weighs the same when the
// loss is stated as weights.
func TestCompletenessEntersThePositionsOnly(t *testing.T) {
	c := invented.Motions(mock.Motions{Members: 4000, Radius: within(invented, 1), Reach: 20}, rand.New(rand.NewPCG(8, 41)))
	full := fitted(t, c, "given", method.Settings{"mass": method.Exactly(8e14), "concentration": method.Exactly(4), "anisotropy": method.Exactly(0)})
	rng := rand.New(rand.NewPCG(8, 42))
	half := phaseSpace{from: full.data.from, to: full.data.to}
	total := 0.0
	for i, lnR := range full.data.lnR {
		w := 1.0
		if lnR > math.Log(700) {
			if w = 2; rng.Float64() < 0.5 {
				continue
			}
		}
		half.lnR = append(half.lnR, lnR)
		half.velocity, half.noise, half.limit = append(half.velocity, full.data.velocity[i]), append(half.noise, 0), append(half.limit, full.data.limit[i])
		half.weight = append(half.weight, w)
		total += w
	}
	for i := range half.weight {
		half.weight[i] *= float64(len(half.weight)) / total
	}
	// The best tracer_concentration of a line of them, all else at the truth.
	best := func(d phaseSpace) float64 {
		full.data = d
		lnL := full.likelihood()
		top, at := math.Inf(-1), 0.0
		for ct := 2.0; ct < 8; ct += 0.1 {
			if l := lnL([]float64{ct, 0}); l > top {
				top, at = l, ct
			}
		}
		return at
	}
	all := full.data
	weighted := best(half)
	half.weight = nil
	unweighted := best(half)
	// 4000 galaxies fix the concentration to about 0.15.
	between(t, "tracer_concentration, all galaxies", best(all), 3.4, 4.6)
	between(t, "tracer_concentration, losses weighted", weighted, 3.4, 4.6)
	if unweighted < 5 {
		t.Errorf("without weights the losses change nothing: %.1f", unweighted)
	}
}

// A sample clipped at 2.7 σ is not taken for a colder one.
func TestClippedSampleIsNotColder(t *testing.T) {
	c := invented.Motions(mock.Motions{Members: 3000, Radius: within(invented, 1), Reach: 20}, rand.New(rand.NewPCG(9, 41)))
	at := method.Settings{"concentration": method.Exactly(4), "anisotropy": method.Exactly(0), "tracer_concentration": method.Exactly(4), "interloper_fraction": method.Exactly(0)}
	best := func(members string, cut bool) float64 {
		f := fitted(t, c, members, at)
		f.data.cut = cut
		lnL := f.likelihood()
		top, mass := math.Inf(-1), 0.0
		for m := 6e14; m < 1.1e15; m *= 1.02 {
			if l := lnL([]float64{m, 0}); l > top {
				top, mass = l, m
			}
		}
		return mass
	}
	// 3000 galaxies fix ln M to 0.04.
	given, clipped, ignored := best("given", false), best("sigma-clip", true), best("sigma-clip", false)
	between(t, "mass of the clipped sample over that of all", clipped/given, 0.93, 1.07)
	if ignored > 0.95*given {
		t.Errorf("clipping changes nothing: %.3f", ignored/given)
	}
}

func TestJeansRepeats(t *testing.T) {
	c := invented.Motions(mock.Motions{Members: 40, Radius: within(invented, 1)}, rand.New(rand.NewPCG(2, 3)))
	task := weighing(t, invented, tableOf(c), "given")
	task.Sampling.Draws = 200
	if _, err := reduced(t, task); err != nil {
		t.Fatal(err)
	}
	var first []byte
	for _, workers := range []int{1, 3} {
		task.Sampling.Workers = workers
		d, err := weigh(t, task, jeans, nil)
		if err != nil {
			t.Fatal(err)
		}
		data, err := d.MarshalBinary()
		if err != nil {
			t.Fatal(err)
		}
		if first == nil {
			first = data
		} else if !bytes.Equal(first, data) {
			t.Error("the number of workers changes the draws")
		}
	}
}

// Calibration: with mass, concentration and anisotropy drawn from the priors of
// the analysis the 68% interval of M_200c holds the truth in 68.3% of systems in
// equilibrium.
func TestCoverageOfJeans(t *testing.T) {
	if os.Getenv("STEELYARD_SLOW") == "" {
		t.Skip("weighs some hundred catalogues; set STEELYARD_SLOW=1 to run it")
	}
	mass, err := prior.LogUniform(2e14, 2e15)
	if err != nil {
		t.Fatal(err)
	}
	c200, err := prior.LogNormal(4, 0.3)
	if err != nil {
		t.Fatal(err)
	}
	beta, err := prior.Uniform(-0.5, 0.5)
	if err != nil {
		t.Fatal(err)
	}
	for _, n := range []int{50, 200, 1000} {
		t.Run(fmt.Sprint(n), func(t *testing.T) { jeansCoverage(t, n, mass, c200, beta) })
	}
}

func jeansCoverage(t *testing.T, n int, mass, c200, beta prior.Prior) {
	t.Helper()
	const mocks = 200
	inside, mean := 0, 0.0
	for k := range uint64(mocks) {
		rng := rand.New(rand.NewPCG(k, uint64(n)))
		truth := invented
		truth.M200, truth.C200 = mass.FromScore(rng.NormFloat64()), c200.FromScore(rng.NormFloat64())
		catalogue := truth.Motions(mock.Motions{Members: n, Radius: within(truth, 1.2), Reach: 20, RedshiftError: 1e-4, Anisotropy: beta.FromScore(rng.NormFloat64())}, rng)
		task := weighing(t, truth, tableOf(catalogue), "given")
		task.Sampling.Stream = infer.NewStream(fmt.Sprint(n, k))
		if _, err := reduced(t, task); err != nil {
			t.Fatal(err)
		}
		d, err := weigh(t, task, jeans, method.Settings{
			"intrinsic_scatter": method.Exactly(0), "mass": {Set: true, Prior: mass}, "concentration": {Set: true, Prior: c200},
		})
		if err != nil {
			t.Fatal(err)
		}
		p := infer.Percentiles(d.Parameter("mass_200c").Values, 16, 50, 84)
		if p[0] < truth.M200 && truth.M200 < p[2] {
			inside++
		}
		mean += math.Log(p[1]/truth.M200) / mocks
	}
	share := float64(inside) / mocks
	t.Logf("%d galaxies: %.3f of the intervals hold the truth, mean offset of ln M %+.3f", n, share, mean)
	between(t, fmt.Sprintf("coverage with %d galaxies", n), share, 0.683-3*math.Sqrt(0.683*0.317/mocks), 0.683+3*math.Sqrt(0.683*0.317/mocks))
}

func BenchmarkJeans500(b *testing.B) {
	c := invented.Motions(mock.Motions{Members: 500, Radius: within(invented, 1.5)}, rand.New(rand.NewPCG(1, 1)))
	task := weighing(b, invented, tableOf(c), "given")
	task.Sampling.Draws = 4000
	if _, err := reduced(b, task); err != nil {
		b.Fatal(err)
	}
	for b.Loop() {
		if _, err := weigh(b, task, jeans, nil); err != nil {
			b.Fatal(err)
		}
	}
}
