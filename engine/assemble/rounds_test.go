package assemble

import (
	"context"
	"fmt"
	"math"
	"slices"
	"strings"
	"testing"

	"steelyard/cache"
	"steelyard/engine"
	"steelyard/engine/weighing"
	"steelyard/probes/catalogue"
	"steelyard/probes/cosmology"
	"steelyard/probes/halo"
)

// rounds weighs a plan with everything its outcome calls for.
func rounds(t *testing.T, p *Plan, ask Ask) *weighing.Weighing {
	t.Helper()
	store, err := cache.Open(t.TempDir(), cache.Options{})
	if err != nil {
		t.Fatal(err)
	}
	defer store.Close()
	for more := true; more; {
		graph, err := engine.NewGraph(p.Nodes)
		if err != nil {
			t.Fatal(err)
		}
		report, err := engine.Run(context.Background(), graph, store, engine.Options{Recipe: p.Recipe.File})
		if err != nil {
			t.Fatal(err)
		}
		if more, err = p.Round(context.Background(), report, ask); err != nil {
			t.Fatal(err)
		}
		if !more {
			w, err := p.Fill(context.Background(), report)
			if err != nil {
				t.Fatal(err)
			}
			return w
		}
	}
	return nil
}

const fastAndSlow = `
object "Avocet" { redshift = 0.1 }
cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3
}
sampling { draws = 2000 }
%s
dynamics "quoted" {
  dispersion { value = "1000 +- 20 km/s" }
  velocity_bias = %s
  estimate "s" {
    method            = "dispersion-scaling"
    relation          = "evrard-2008"
    intrinsic_scatter = 0
  }
}
reported "light" {
  probe           = "lensing"
  mass            = "4.5 +- 0.4 10**14 solMass"
  overdensity     = 200
  source_redshift = 0.8
}
reconcile {
  estimates  = [dynamics.quoted.s, reported.light]
  at         = [overdensity(200)]
  radii_from = "own"
}`

func lever(w *weighing.Weighing, assumption string) *weighing.Lever {
	for i := range w.Levers {
		if w.Levers[i].Assumption == assumption {
			return &w.Levers[i]
		}
	}
	return nil
}

// A dispersion that is too high for the mass of the light: the mass follows the
// velocity bias as b^(−1/α), so the bias that brings the two to one sigma has a
// closed form, whether it is an exact number, a prior or a shared nuisance.
func TestLeversToTheEnd(t *testing.T) {
	for _, c := range []struct{ nuisance, bias, name string }{
		{"", "1", "dynamics.quoted.s.velocity_bias"},
		{"", "normal(1, 0.05)", "dynamics.quoted.s.velocity_bias"},
		{`nuisance "bias" { prior = lognormal(1, 0.05) }`, "nuisance.bias", "nuisance.bias"},
	} {
		w := rounds(t, plan(t, fmt.Sprintf(fastAndSlow, c.nuisance, c.bias), nil), Ask{})
		x := w.Tensions[0]
		if !(x.Sigma > 3) {
			t.Fatalf("%s: the two are only %.1fσ apart", c.bias, x.Sigma)
		}
		l := lever(w, c.name)
		if l == nil || l.Value == nil {
			t.Fatalf("%s: %+v", c.bias, w.Levers)
		}
		// σ ∝ M^0.3361 (Evrard et al. 2008): ln ratio falls by ln b/0.3361, and has
		// to by all but one of its errors.
		ln := math.Log(x.Ratio.Median)
		want := math.Exp(0.3361 * ln * (1 - 1/x.Sigma))
		// A significance of 5σ from 2000 draws scatters by 5/√4000 = 0.08, and the
		// trials may stop 0.1σ short; 1σ is 3.6% in b here. A third more is allowed.
		if math.Abs(*l.Value/want-1) > 0.009 {
			t.Errorf("velocity_bias = %s: %.4f needed, want %.4f", c.bias, *l.Value, want)
		}
		if math.Abs(*l.Sigma-1) > 0.15 || math.Abs(*l.All-1) > 0.15 {
			t.Errorf("velocity_bias = %s: %.2fσ then, of all %.2fσ", c.bias, *l.Sigma, *l.All)
		}
		if exact := c.bias == "1"; exact != (l.InPriorSD == nil) {
			t.Errorf("velocity_bias = %s: in prior sd %v", c.bias, l.InPriorSD)
		}
		for i, other := range w.Levers {
			if other.Value == nil && other.Cannot == "" {
				t.Errorf("%s says neither what it would have to be nor why it cannot", other.Assumption)
			}
			if i > 0 && w.Levers[i-1].Value == nil && other.Value != nil {
				t.Error("one that cannot do it stands before one that can")
			}
		}
		if len(w.Failures) > 0 {
			t.Errorf("failures: %+v", w.Failures)
		}
	}
}

// Masses that agree have no levers, and no round after the weighing.
func TestNoLeversWithoutTension(t *testing.T) {
	p := plan(t, fmt.Sprintf(reportedPair, `"own"`), nil)
	before := len(p.Nodes)
	if w := rounds(t, p, Ask{}); len(w.Levers) > 0 || len(p.Nodes) != before {
		t.Errorf("%d levers in %d nodes more", len(w.Levers), len(p.Nodes)-before)
	}
}

// The verdict says what the recipe takes for certain.
func TestWhatTheVerdictIsGiven(t *testing.T) {
	p := plan(t, fmt.Sprintf(fastAndSlow, "", "1"), nil)
	w := rounds(t, p, Ask{})
	if given := strings.Join(w.Consistency[0].Given, "; "); !strings.Contains(given, "galaxies that move like the dark matter") {
		t.Errorf("given %q", given)
	}
}

// Two estimates of one dispersion show a spread of methods, and the preferred one
// alone is evidence.
func TestSameDataIsOneEvidence(t *testing.T) {
	recipe := fmt.Sprintf(fastAndSlow, "", "1")
	recipe = strings.Replace(recipe, `  estimate "s" {`, `  estimate "t" {
    method            = "dispersion-scaling"
    relation          = "munari-2013"
    tracer            = "galaxies"
    intrinsic_scatter = 0
  }
  estimate "s" {`, 1)
	recipe = strings.Replace(recipe, "[dynamics.quoted.s, reported.light]", "[dynamics.quoted.s, dynamics.quoted.t, reported.light]\n  preferred  = [dynamics.quoted.t]\n  combined   = \"random-effects\"", 1)
	w := rounds(t, plan(t, recipe, nil), Ask{})
	if len(w.Tensions) != 2 || len(w.Spreads) != 1 {
		t.Fatalf("%d tensions, %d spreads", len(w.Tensions), len(w.Spreads))
	}
	if of := strings.Join(w.Consistency[0].Of, " "); of != "dynamics.quoted.t reported.light" {
		t.Errorf("the agreement is of %s", of)
	}
	if _, ok := w.Combined[0].Weights["dynamics.quoted.s"]; ok || w.CombinedBy != "random-effects" {
		t.Errorf("combined by %s: %+v", w.CombinedBy, w.Combined)
	}
}

// Leaving a bin out leaves it out: the innermost and the outermost row of a table,
// whatever the order of the file.
func TestWithoutRow(t *testing.T) {
	table := &catalogue.Table{Rows: []int{1, 2, 3}, Columns: []catalogue.Column{{Name: "outer", Unit: "kpc", Values: []float64{300, 100, 200}}}}
	for _, c := range []struct {
		outermost bool
		want      []float64
	}{{false, []float64{300, 200}}, {true, []float64{100, 200}}} {
		short, err := withoutRow(table, c.outermost)
		if err != nil {
			t.Fatal(err)
		}
		if got := short.Values("outer"); !slices.Equal(got, c.want) {
			t.Errorf("outermost %t leaves %v, want %v", c.outermost, got, c.want)
		}
	}
	if _, err := withoutRow(table.Pick([]int{0}), true); err == nil {
		t.Error("the only bin was left out")
	}
}

// The cut that makes members is moved both ways, and what it changes is told at
// every place.
func TestSensitivityToTheEnd(t *testing.T) {
	recipe := strings.Replace(ground, "draws = 400", "draws = 200", 1) + `
dynamics "d" {
  galaxies {
    file     = "galaxies.csv"
    ra       = column("ra", "deg")
    dec      = column("dec", "deg")
    redshift = column("z")
  }
  members {
    method = "sigma-clip"
    clip   = 2.4
  }
  estimate "s" { method = "dispersion-scaling" }
}`
	w := rounds(t, plan(t, recipe, map[string]string{"galaxies.csv": bell()}), Ask{Sensitivity: true})
	var changes []string
	for _, s := range w.Sensitivity {
		changes = append(changes, s.Change)
		if s.Estimate != "dynamics.d.s" || s.At != "overdensity 500" || !(s.Mass.Median > 0) {
			t.Errorf("%+v", s)
		}
	}
	if want := []string{"with the members' clip at 2", "with the members' clip at 2.88"}; !slices.Equal(changes, want) {
		t.Fatalf("changes %q, want %q; warnings %q, failures %v", changes, want, w.Warnings, w.Failures)
	}
	if !(w.Sensitivity[0].LnChange < w.Sensitivity[1].LnChange) {
		t.Errorf("a narrower cut gives %.3f, a wider %.3f in ln M", w.Sensitivity[0].LnChange, w.Sensitivity[1].LnChange)
	}
}

// bell is a table of eighty galaxies whose velocities are those of a normal law,
// with a few far from it.
func bell() string {
	var b strings.Builder
	b.WriteString("ra,dec,z\n")
	for i := range 80 {
		u := (float64(i*37%80) + 0.5) / 80
		fmt.Fprintf(&b, "150.0,%.6f,%.6f\n", 2+float64(i)/400, 0.1+0.0025*math.Log(u/(1-u)))
	}
	return b.String()
}

// shears is the tangential reduced shear of a halo of 1e15 Msun at z = 0.2 for
// sources at z = 1, without noise.
func shears(t *testing.T, concentration float64) string {
	t.Helper()
	c, err := cosmology.New(cosmology.Params{HubbleConstant: 70, OmegaMatter: 0.3, OmegaLambda: 0.7, W0: -1})
	if err != nil {
		t.Fatal(err)
	}
	threshold, err := halo.Definition{Delta: 200, Of: "critical"}.Threshold(c, 0.2)
	if err != nil {
		t.Fatal(err)
	}
	h, critical := halo.NewNFW(1e15, concentration, threshold), c.SigmaCritical(0.2, 1)
	var b strings.Builder
	b.WriteString("R,g,e\n")
	for r := 150.0; r < 3000; r *= 1.35 {
		fmt.Fprintf(&b, "%.1f,%.6f,0.006\n", r, h.ExcessSurfaceDensity(r)/critical/(1-h.SurfaceDensity(r)/critical))
	}
	return b.String()
}

// Two shear profiles that share a concentration, one of them steep and one
// shallow: the draws of either hardly reach where both put it, so both are made
// again there, and the comparison says so.
func TestEstimatesAreMadeAgainWhereTheyMeet(t *testing.T) {
	block := func(name string) string {
		return fmt.Sprintf(`
lensing "%[1]s" {
  profile {
    file            = "%[1]s.csv"
    radius          = column("R", "kpc")
    value           = column("g")
    error           = column("e")
    source_redshift = 1
  }
  estimate "nfw" {
    method        = "tangential-shear"
    covariance    = ["shape"]
    concentration = nuisance.shape
  }
}`, name)
	}
	p := plan(t, `
object "Avocet" { redshift = 0.2 }
cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3
}
sampling { draws = 1000 }
nuisance "shape" { prior = lognormal(5, 0.4) }`+block("steep")+block("shallow")+`
reconcile {
  estimates = [lensing.steep.nfw, lensing.shallow.nfw]
  at        = [radius("1 Mpc")]
  limits    = [20, 30, 50] # no levers
}`, map[string]string{"steep.csv": shears(t, 9), "shallow.csv": shears(t, 3)})
	w := rounds(t, p, Ask{})
	if p.suffix == "" || len(w.Tensions) != 1 {
		t.Fatalf("nothing was made again: %q, %d tensions", p.suffix, len(w.Tensions))
	}
	if all := strings.Join(w.Warnings, "\n"); !strings.Contains(all, "made again where they meet") {
		t.Errorf("warnings %q", w.Warnings)
	}
	// The masses printed of an estimate alone stay its own.
	for _, e := range w.Estimates {
		if len(e.At) != 1 || math.Abs(math.Log(e.Own[2].Mass.Median/1e15)) > 0.1 {
			t.Errorf("%s: %+v", e.Name, e.Own[2])
		}
		// M(<1 Mpc) of either halo, from NFW's closed form.
		c := map[string]float64{"lensing.steep.nfw": 9, "lensing.shallow.nfw": 3}[e.Name]
		if want := within(t, c, 1000); math.Abs(math.Log(e.At[0].Mass.Median/want)) > 0.05 {
			t.Errorf("%s within 1 Mpc: %.4g, want %.4g", e.Name, e.At[0].Mass.Median, want)
		}
	}
}

// within is the mass inside r of the halo of shears.
func within(t *testing.T, concentration, r float64) float64 {
	t.Helper()
	c, err := cosmology.New(cosmology.Params{HubbleConstant: 70, OmegaMatter: 0.3, OmegaLambda: 0.7, W0: -1})
	if err != nil {
		t.Fatal(err)
	}
	threshold, err := halo.Definition{Delta: 200, Of: "critical"}.Threshold(c, 0.2)
	if err != nil {
		t.Fatal(err)
	}
	return halo.NewNFW(1e15, concentration, threshold).Mass(r)
}
