package reconcile

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"steelyard/probes/cosmology"
	"steelyard/probes/halo"
	"steelyard/probes/infer"
)

func compare(t *testing.T, s Setup) (*Matching, *Result) {
	t.Helper()
	m := matchEstimates(t, s)
	r, err := Compare(m, Limits, infer.NewStream("compare"))
	if err != nil {
		t.Fatal(err)
	}
	return m, r
}

func independent(level, noise float64) model {
	return model{level: level, noise: noise, effect: linear()}
}

func named(name string, d *infer.Draws) Estimate { return Estimate{Name: name, Block: name, Draws: d} }

// Of three masses one of which is apart, leaving that one out restores agreement,
// and leaving out another leaves the tension of the remaining pair.
func TestLeavingOneOut(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 21))
	_, r := compare(t, Setup{
		Estimates: []Estimate{named("a", independent(34, 0.1).draws(rng, 4000)), named("b", independent(34, 0.1).draws(rng, 4000)), named("c", independent(34.6, 0.12).draws(rng, 4000))},
		Places:    []At{{Radius: 1000}},
	})
	c := r.Consistency[0]
	// 4000 draws of each know a difference to 2% of its error.
	if c.Without[2] > 0.1 {
		t.Errorf("without c: %.2fσ", c.Without[2])
	}
	for i, pair := range []int{2, 1} { // without a: b/c, the last; without b: a/c
		want := math.Abs(r.Tensions[pair].Sigma)
		if math.Abs(c.Without[i]-want) > 1e-9 {
			t.Errorf("without %s: %.3fσ, want the pair's %.3fσ", c.Of[i], c.Without[i], want)
		}
	}
	if c.Verdict != "in tension" || c.Sigma < 3 {
		t.Errorf("%.2fσ: %s", c.Sigma, c.Verdict)
	}
}

// Of four, leaving one out is the agreement of the other three.
func TestLeavingOneOfFourOut(t *testing.T) {
	rng := rand.New(rand.NewPCG(2, 21))
	var all []Estimate
	level := []float64{34, 34.2, 34.1, 34.4}
	for k, name := range []string{"a", "b", "c", "d"} {
		all = append(all, named(name, independent(level[k], 0.12).draws(rng, 4000)))
	}
	_, four := compare(t, Setup{Estimates: all, Places: []At{{Radius: 1000}}})
	_, three := compare(t, Setup{Estimates: all[:3], Places: []At{{Radius: 1000}}})
	// Fewer points tell the one than the other: 600 against thousands, an error of
	// p of 2% where it is a half, 0.05σ.
	if got, want := four.Consistency[0].Without[3], three.Consistency[0].Sigma; math.Abs(got-want) > 0.12 {
		t.Errorf("without d: %.2fσ, the others alone %.2fσ", got, want)
	}
}

// The same draws under two names are one mass; two methods on one data set are
// one evidence, of the preferred of them.
func TestSameDataNeverCountsTwice(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 21))
	d, other := independent(34, 0.1).draws(rng, 2000), independent(34.1, 0.1).draws(rng, 2000)
	m, r := compare(t, Setup{Estimates: []Estimate{named("a", d), named("twin", d), named("c", other)}, Places: []At{{Radius: 1000}}})
	if len(m.Members) != 2 || len(r.Tensions) != 2 || len(r.Spreads) != 1 || math.Abs(r.Spreads[0].Ratio-1) > 1e-12 {
		t.Errorf("members %v, %d tensions, spreads %+v", m.Members, len(r.Tensions), r.Spreads)
	}
	if !strings.Contains(strings.Join(r.Warnings, " "), "a and twin are the same draw by draw") {
		t.Errorf("warnings %q", r.Warnings)
	}
	methods := []Estimate{named("a", d), named("b", independent(34.3, 0.1).draws(rng, 2000)), named("c", other)}
	methods[1].Block = "a"
	for _, c := range []struct {
		preferred []string
		want      string
	}{{nil, "a c"}, {[]string{"b"}, "b c"}, {[]string{"a", "c"}, "a c"}} {
		_, r := compare(t, Setup{Estimates: methods, Places: []At{{Radius: 1000}}, Preferred: c.preferred})
		if got := strings.Join(r.Consistency[0].Of, " "); got != c.want {
			t.Errorf("preferred %q: the agreement is of %s, want %s", c.preferred, got, c.want)
		}
		if got := strings.Join(r.Combined[0].Of, " "); got != c.want {
			t.Errorf("preferred %q: the combination is of %s, want %s", c.preferred, got, c.want)
		}
		// ln ratio is −0.3, known to 0.1·√(2/2000)·1.25.
		if s := r.Spreads[0]; math.Abs(math.Log(s.Ratio)+0.3) > 0.015 {
			t.Errorf("spread %+v", s)
		}
	}
}

// What should not be believed is said wherever it counts.
func TestDoubtsAreSaid(t *testing.T) {
	rng := rand.New(rand.NewPCG(4, 21))
	poor, stuck, inner := independent(34, 0.1).draws(rng, 1000), independent(34, 0.1).draws(rng, 1000), independent(34, 0.1).draws(rng, 1000)
	poor.Quality.Dof, poor.Quality.PValue = 5, 1e-5
	stuck.Quality.Converged = false
	inner.Covers = [2]float64{500, 700}
	stuck.Covers = [2]float64{900, 2000}
	m, r := compare(t, Setup{Estimates: []Estimate{named("poor", poor), named("stuck", stuck), named("inner", inner)}, Places: []At{{Radius: 1000}}})
	if got := strings.Join(r.Tensions[0].Doubtful, "; "); got != "poor is poorly fitted; stuck did not converge" {
		t.Errorf("the tension of both: %q", got)
	}
	if got := r.Tensions[1].Doubtful; len(got) != 1 {
		t.Errorf("the tension of one: %q", got)
	}
	if len(r.Consistency[0].Doubtful) != 2 {
		t.Errorf("the agreement: %q", r.Consistency[0].Doubtful)
	}
	all := strings.Join(m.Warnings, "\n")
	for _, want := range []string{"stuck did not converge", "poor is poorly fitted", "stuck (900 to 2000 kpc) and inner (500 to 700 kpc) have no radius in common"} {
		if !strings.Contains(all, want) {
			t.Errorf("%q is not among %q", want, m.Warnings)
		}
	}
	for _, mark := range m.Places[0].Marks {
		if mark.Extrapolated != (mark.Name == "inner") {
			t.Errorf("%s at 1000 kpc: extrapolated %t", mark.Name, mark.Extrapolated)
		}
	}
}

// background is one in which a sphere's mean density at 200 times critical has a
// radius of its own for every mass.
func background(t testing.TB) Background {
	t.Helper()
	c, err := cosmology.New(cosmology.Params{HubbleConstant: 70, OmegaMatter: 0.3, OmegaLambda: 0.7, W0: -1})
	if err != nil {
		t.Fatal(err)
	}
	return Background{c, 0.2}
}

// powerLaw draws profiles M = exp(level) (r/1000 kpc)^slope.
func powerLaw(rng *rand.Rand, n int, level, noise, slope float64) *infer.Draws {
	d := independent(level, noise).draws(rng, n)
	middle := make([]float64, n)
	for i := range middle {
		middle[i] = d.LnMass[3*i+1]
	}
	d.Radii, d.LnMass = infer.Grid(), nil
	for _, ln := range middle {
		for _, r := range d.Radii {
			d.LnMass = append(d.LnMass, ln+slope*math.Log(r/1000))
		}
	}
	return d
}

// Two power laws of slopes 1 and 1.5: at the radius of the first, whose error is
// half that of its mass in ln, moving the radius by that error changes ln ratio
// by half a slope of that.
func TestChoiceOfRadius(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 21))
	const sd = 0.2
	b := background(t)
	m, r := compare(t, Setup{
		Estimates: []Estimate{named("a", powerLaw(rng, 8000, 34, sd, 1)), named("b", powerLaw(rng, 8000, 34, 0.1, 1.5))},
		Places:    []At{{Definition: halo.Definition{Delta: 200, Of: "critical"}}}, RadiiFrom: "a", Background: b,
	})
	// M ∝ r and M ∝ r³ meet at ln r = ln M/2 + …: the 68% half width of ln r is sd/2.
	place := m.Places[0]
	if half := math.Log(place.Radius.Hi/place.Radius.Lo) / 2; math.Abs(half/(0.99446*sd/2)-1) > 0.03 {
		t.Errorf("ln R has an error of %.4f, want %.4f", half, 0.99446*sd/2)
	}
	if got, want := r.Tensions[0].RadiusLn, 0.5*0.99446*sd/2; math.Abs(got/want-1) > 0.05 {
		t.Errorf("the choice of radius adds %.4f to ln ratio, want %.4f", got, want)
	}
	fixed, _ := compare(t, Setup{Estimates: []Estimate{named("a", powerLaw(rng, 500, 34, 0.2, 1)), named("b", powerLaw(rng, 500, 34, 0.1, 1.5))}, Places: []At{{Radius: 1000}}})
	if fixed.Places[0].Radius != (Interval{}) {
		t.Error("a fixed radius has an error")
	}
}

// The combined profile of two power laws of one slope is a power law whose level
// is their best linear mean, and its own R_Δ and M_Δ follow.
func TestCombinedProfile(t *testing.T) {
	rng := rand.New(rand.NewPCG(6, 21))
	b := background(t)
	def := halo.Definition{Delta: 200, Of: "critical"}
	m, r := compare(t, Setup{
		Estimates: []Estimate{named("a", powerLaw(rng, 8000, 34.0, 0.1, 1)), named("b", powerLaw(rng, 8000, 34.1, 0.2, 1))},
		Places:    []At{{Radius: 1000}}, Own: []halo.Definition{def}, Background: b,
	})
	threshold, err := def.Threshold(b.Cosmology, b.Redshift)
	if err != nil {
		t.Fatal(err)
	}
	// Weights 0.8 and 0.2; 4π/3·ρ·R³ = exp(34.02)·R/1000.
	level := 34.02
	radius := math.Sqrt(math.Exp(level) / 1000 / (4 * math.Pi / 3 * threshold))
	got := m.Combined[0].Own[0]
	// 8000 draws know ln M to 0.1·0.9/√8000·1.25 = 0.0013, ln R to half that; the
	// weights of 1.6% noise in the errors move it by 0.0005.
	if math.Abs(math.Log(got.Radius.Median/radius)) > 0.003 {
		t.Errorf("R_200 = %.1f kpc, want %.1f", got.Radius.Median, radius)
	}
	if want := math.Exp(level) * radius / 1000; math.Abs(math.Log(got.Mass.Median/want)) > 0.006 {
		t.Errorf("M_200 = %.4g, want %.4g", got.Mass.Median, want)
	}
	c := r.Combined[0]
	if math.Abs(c.Linear.Weights[0]-0.8) > 0.02 || math.Abs(math.Log(c.Linear.Mass.Median)-level) > 0.006 {
		t.Errorf("combined %+v", c.Linear)
	}
	if half := math.Log(c.Linear.Mass.Hi/c.Linear.Mass.Lo) / 2; math.Abs(half/(0.99446*0.1*math.Sqrt(0.8))-1) > 0.04 {
		t.Errorf("its error is %.4f in ln M, want %.4f", half, 0.99446*0.1*math.Sqrt(0.8))
	}
	if c.Scatter != nil || len(m.Combined) != 1 {
		t.Error("0.45σ apart, and scatter was found")
	}
}

// Masses that scatter more than their errors are combined with scatter too: of
// two, τ² = Δ²/2 − (σ₁² + σ₂²)/2, by χ² = Δ²/(σ₁² + σ₂² + 2τ²) = 1.
func TestScatterBeyondTheErrors(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 21))
	_, r := compare(t, Setup{
		Estimates: []Estimate{named("a", independent(34, 0.1).draws(rng, 8000)), named("b", independent(34.6, 0.15).draws(rng, 8000))},
		Places:    []At{{Radius: 1000}},
	})
	c := r.Combined[0]
	if c.Scatter == nil {
		t.Fatal("no scatter was found")
	}
	tau2 := 0.36/2 - (0.01+0.0225)/2
	if math.Abs(c.Scatter.ScatterLn/math.Sqrt(tau2)-1) > 0.02 {
		t.Errorf("τ = %.4f, want %.4f", c.Scatter.ScatterLn, math.Sqrt(tau2))
	}
	sd := 1 / math.Sqrt(1/(0.01+tau2)+1/(0.0225+tau2))
	if half := math.Log(c.Scatter.Mass.Hi/c.Scatter.Mass.Lo) / 2; math.Abs(half/(0.99446*sd)-1) > 0.05 {
		t.Errorf("its error is %.4f in ln M, want %.4f", half, 0.99446*sd)
	}
}

// Profiles that move as one are compared like one radius; two independent
// directions like a χ² with two degrees of freedom.
func TestProfileAtOnce(t *testing.T) {
	rng := rand.New(rand.NewPCG(8, 21))
	rigid := func(level float64) *infer.Draws { return powerLaw(rng, 4000, level, 0.1, 1) }
	_, r := compare(t, Setup{Estimates: []Estimate{named("a", rigid(34)), named("b", rigid(34.3))}, Places: []At{{Radius: 500}, {Radius: 1000}, {Radius: 2000}}})
	if p := r.Profiles[0]; p.Kept != 1 || math.Abs(p.Sigma-math.Abs(r.Tensions[0].Sigma)) > 0.01 {
		t.Errorf("as one: %+v, a pair %.3fσ", p, r.Tensions[0].Sigma)
	}
	loose := func(level float64) *infer.Draws {
		d := independent(level, 0.1).draws(rng, 20000)
		for i := range d.N {
			d.LnMass[3*i+2] = level + 0.5 + 0.1*rng.NormFloat64() // the outermost moves on its own
			d.LnMass[3*i] = d.LnMass[3*i+1]
		}
		return d
	}
	_, r = compare(t, Setup{Estimates: []Estimate{named("a", loose(34)), named("b", loose(34.2))}, Places: []At{{Radius: 1000}, {Radius: 2000}}})
	// Δ = −0.2 at both radii, each with an error of 0.1·√2: χ² = 4 for two.
	want := Sigma(infer.ChiSquareP(4, 2))
	if p := r.Profiles[0]; p.Kept != 2 || math.Abs(p.Sigma-want) > 0.06 {
		t.Errorf("apart: %+v, want %.3fσ", p, want)
	}
}

// One estimate is no comparison, a reference that is not compared has no radii,
// and what has no error has no tension.
func TestBadComparisons(t *testing.T) {
	rng := rand.New(rand.NewPCG(9, 21))
	a := named("a", powerLaw(rng, 200, 34, 0.1, 1))
	joint := &Joint{N: 200, Order: [][]int{rng.Perm(200)}}
	if _, err := MatchAll(Setup{Estimates: []Estimate{a}, Places: []At{{Radius: 1000}}}, joint, infer.NewStream("x")); err == nil {
		t.Error("one estimate was compared")
	}
	joint.Order = append(joint.Order, rng.Perm(200))
	pair := Setup{Estimates: []Estimate{a, named("b", powerLaw(rng, 200, 34, 0.1, 1))}, Background: background(t), RadiiFrom: "c"}
	pair.Places = []At{{Definition: halo.Definition{Delta: 500, Of: "critical"}}}
	if _, err := MatchAll(pair, joint, infer.NewStream("x")); err == nil || !strings.Contains(err.Error(), `"c"`) {
		t.Errorf("radii of an estimate that is not compared: %v", err)
	}
	pair.Places = []At{{Radius: 1e6}}
	if _, err := MatchAll(pair, joint, infer.NewStream("x")); err == nil || !strings.Contains(err.Error(), "outside the grid") {
		t.Errorf("a radius of a gigaparsec: %v", err)
	}
	still := placeOf([][]float64{{34, 34, 34}, {35, 35, 35}})
	if _, err := difference(still, 0, 1); err == nil {
		t.Error("two numbers without an error have a tension")
	}
}
