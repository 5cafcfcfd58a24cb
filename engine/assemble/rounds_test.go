package assemble

import (
	"context"
	"fmt"
	"math"
	"strings"
	"testing"

	"steelyard/cache"
	"steelyard/engine"
	"steelyard/engine/weighing"
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
		// 2000 draws know a mean to 2% of its error and σ to 2% of itself, which is
		// 0.05 in σ or 0.2% in b; the trials may stop 0.1σ short.
		if math.Abs(*l.Value/want-1) > 0.006 {
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
