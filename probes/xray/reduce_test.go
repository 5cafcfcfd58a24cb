package xray

import (
	"context"
	"math"
	"strings"
	"testing"

	"steelyard/probes/catalogue"
	"steelyard/probes/estimate"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

func publishedDensity(t testing.TB, block method.Settings) (*Gas, error) {
	out, err := reduceDensity(context.Background(), &estimate.Task{
		Name: "xray.a", Object: estimate.Object{Redshift: 0.2}, Cosmology: flat(t, 70, 0.3),
		Tables: map[string]*catalogue.Table{}, Blocks: map[string]method.Settings{"density": block},
	})
	if err != nil {
		return nil, err
	}
	return out.(*Gas), nil
}

func TestPublishedDensity(t *testing.T) {
	distance := flat(t, 70, 0.3).AngularDiameter(0.2)
	angle := method.Exactly(120 / distance)
	angle.Unit = "rad"
	g, err := publishedDensity(t, method.Settings{
		"model": method.Word("beta"), "n0": must(prior.Normal(0.01, 0.001)), "rc": angle, "beta": must(prior.TwoPiece(0.6, 0.02, 0.03)),
	})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "n_e", math.Exp(g.LnElectrons(120)), 0.01*math.Pow(2, -0.9), 1e-14)
	if len(g.Moves) != 2 {
		t.Fatalf("%d directions for two errors", len(g.Moves))
	}
	// d ln n_e = d n0/n0 − 1.5 ln(1 + r²/rc²) dβ; a two-piece normal counts with
	// the mean of its sides, over the score of the 84th percentile.
	near(t, "move along n0", g.Mode(0, 120), 0.1, 1e-6)
	near(t, "move along β", g.Mode(1, 120), -1.5*math.Ln2*0.025/0.994457883209753, 1e-6)

	// The modified form with what is left out: no cusp, no steepening, no second
	// component.
	g, err = publishedDensity(t, method.Settings{"model": method.Word("modified-beta"), "n0": method.Exactly(0.01), "rc": method.Exactly(120), "beta": method.Exactly(0.6)})
	if err != nil {
		t.Fatal(err)
	}
	near(t, "n_e", math.Exp(g.LnElectrons(120)), math.Sqrt(1.2)*0.01*math.Pow(2, -0.9), 1e-14)
}

func TestIncompletePublishedDensity(t *testing.T) {
	beta := func(extra ...string) method.Settings {
		s := method.Settings{"model": method.Word("beta"), "n0": method.Exactly(0.01), "rc": method.Exactly(120), "beta": method.Exactly(0.6)}
		for _, name := range extra {
			s[name] = method.Exactly(1)
		}
		return s
	}
	without := beta()
	delete(without, "rc")
	negative := beta()
	negative["rc"] = method.Exactly(-3)
	lone := beta("n02")
	lone["model"] = method.Word("modified-beta")
	steep := beta("epsilon")
	steep["model"] = method.Word("modified-beta")
	for _, c := range []struct {
		block method.Settings
		want  string
	}{
		{method.Settings{}, "needs a file, or a model"},
		{without, `"beta" needs rc`},
		{negative, "rc = -3 of the density model is not positive"},
		{beta("alpha"), `"beta" has no alpha`},
		{lone, "needs rc2 and beta2"},
		{steep, "needs rs"},
	} {
		if _, err := publishedDensity(t, c.block); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%v: %v, want %q", c.block, err, c.want)
		}
	}
	// Parameters beside a file would be ignored: refused.
	tab := table("n.csv", column("inner", "kpc", []float64{0, 50, 100}), column("outer", "kpc", []float64{50, 100, 200}),
		column("value", "cm**-3", []float64{3e-2, 1e-2, 3e-3}), column("error", "cm**-3", []float64{1e-3, 1e-3, 3e-4}))
	task := onlyTemperature(t, tab)
	task.Blocks["density"] = method.Settings{"model": method.Word("beta"), "beta": method.Exactly(0.6)}
	if _, err := reduceDensity(context.Background(), task); err == nil || !strings.Contains(err.Error(), "both a file and beta") {
		t.Errorf("a file and a parameter: %v", err)
	}
}

// The declarations are consistent: every setting a method reads is declared,
// every default lies in its range, and every column has a canonical unit.
func TestDeclarations(t *testing.T) {
	for _, m := range Probe.Methods {
		if m.Summary == "" || m.Equation == "" || len(m.Sources) == 0 || m.Version < 1 || len(m.Data) == 0 {
			t.Errorf("%s: incomplete declaration", m.Name)
		}
		for _, s := range m.Settings {
			if s.Doc == "" {
				t.Errorf("%s: %s has no doc", m.Name, s.Name)
			}
			if median := s.Default.Prior.Median(); s.Default.Set && s.Kind == method.Number && s.High > s.Low && (median < s.Low || median > s.High) {
				t.Errorf("%s: the default of %s, %v, lies outside %g to %g", m.Name, s.Name, s.Default.Prior, s.Low, s.High)
			}
		}
		for _, name := range m.Uses {
			found := false
			for _, r := range Probe.Reductions {
				found = found || r.Name == name
			}
			if !found {
				t.Errorf("%s uses %s, which is no reduction", m.Name, name)
			}
		}
	}
}
