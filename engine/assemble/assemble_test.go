package assemble

import (
	"context"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"steelyard/cache"
	"steelyard/engine"
	"steelyard/engine/weighing"
	"steelyard/probes/catalogue"
)

// plan reads a recipe written to a folder of its own, with its data files.
func plan(t *testing.T, recipe string, files map[string]string) *Plan {
	t.Helper()
	dir := t.TempDir()
	for name, content := range files {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(content), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	path := filepath.Join(dir, "recipe.hcl")
	if err := os.WriteFile(path, []byte(recipe), 0o644); err != nil {
		t.Fatal(err)
	}
	r, diagnostics := Load(path)
	if diagnostics.HasErrors() {
		var b strings.Builder
		_ = diagnostics.Text(&b)
		t.Fatal(b.String())
	}
	p, err := New(r)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// execute runs a plan in a store of its own.
func execute(t *testing.T, p *Plan) *engine.Report {
	t.Helper()
	graph, err := engine.NewGraph(p.Nodes)
	if err != nil {
		t.Fatal(err)
	}
	store, err := cache.Open(t.TempDir(), cache.Options{})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { store.Close() })
	report, err := engine.Run(context.Background(), graph, store, engine.Options{Recipe: p.Recipe.File})
	if err != nil {
		t.Fatal(err)
	}
	return report
}

const ground = `
object "Avocet" {
  redshift = 0.1
  centre   = sky("150.0", "2.0")
}
cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3
}
sampling { draws = 400 }
`

// galaxies is a table of twenty, each one arcmin further north than the last.
func galaxies() string {
	var b strings.Builder
	b.WriteString("ra,dec,z,quality\n")
	for i := range 20 {
		fmt.Fprintf(&b, "150.0,%.6f,%.5f,%d\n", 2+float64(i)/60, 0.1+0.002*math.Sin(float64(7*i)), i%2)
	}
	return b.String()
}

// The separation from the centre selects rows: by arcmin, by an angle with its
// unit, and by a length at the object's distance, together with other columns.
func TestSelectBySeparation(t *testing.T) {
	// 1′ at z = 0.1 is 110.66 kpc (astropy: FlatLambdaCDM(70, 0.3)).
	for condition, want := range map[string][]int{
		"separation < 3.5":                 {1, 2, 3, 4},
		"separation < '210 arcsec'":        {1, 2, 3, 4},
		"separation < '340 kpc'":           {1, 2, 3, 4},
		"separation < 5.5 && quality == 1": {2, 4, 6},
		"quality == 1 && z > 0":            {2, 4, 6, 8, 10, 12, 14, 16, 18, 20},
	} {
		p := plan(t, ground+fmt.Sprintf(`
dynamics "d" {
  galaxies {
    file     = "galaxies.csv"
    ra       = column("ra", "deg")
    dec      = column("dec", "deg")
    redshift = column("z")
    select   = %q
  }
  members { method = "given" }
  estimate "s" { method = "dispersion-scaling" }
}`, condition), map[string]string{"galaxies.csv": galaxies()})
		report := execute(t, p)
		b, err := report.Output(context.Background(), "dynamics.d.galaxies.table")
		if err != nil {
			t.Fatalf("%s: %v", condition, err)
		}
		var table catalogue.Table
		if err := table.UnmarshalBinary(b); err != nil {
			t.Fatal(err)
		}
		if !slices.Equal(table.Rows, want) {
			t.Errorf("%s keeps rows %v, want %v", condition, table.Rows, want)
		}
		if len(table.Columns) != 3 {
			t.Errorf("%s leaves %d columns", condition, len(table.Columns))
		}
	}
}

const reportedPair = ground + `
reported "a" {
  probe       = "lensing"
  mass        = "5 +- 0.5 10**14 solMass"
  overdensity = 500
  source_redshift = 0.8
}
reported "b" {
  probe       = "xray"
  mass        = "4 +- 0.4 10**14 solMass"
  overdensity = 500
}
reconcile {
  estimates  = [reported.a, reported.b]
  at         = [overdensity(500), overdensity(200, "mean"), overdensity("virial"), radius("8 arcmin")]
  radii_from = %s
}`

// Two published masses are weighed to the end: a radius given as an angle is
// converted, every overdensity asked for is among the own masses, and the ratio
// at own radii is that of the published numbers.
func TestReportedMassesToTheEnd(t *testing.T) {
	for _, from := range []string{"reported.a", `"own"`} {
		p := plan(t, fmt.Sprintf(reportedPair, from), nil)
		w, err := p.Fill(context.Background(), execute(t, p))
		if err != nil {
			t.Fatal(err)
		}
		if len(w.Failures) > 0 || len(w.Estimates) != 2 || len(w.Tensions) != 4 || len(w.Consistency) != 4 {
			t.Fatalf("from %s: %+v", from, w)
		}
		for _, e := range w.Estimates {
			if len(e.Own) != 5 || len(e.At) != 4 {
				t.Fatalf("%s: %d own masses, %d places", e.Name, len(e.Own), len(e.At))
			}
			// 8′ at z = 0.1 is 885.26 kpc (astropy).
			if last := e.At[3]; math.Abs(last.Radius-885.26) > 0.01 || !strings.HasPrefix(last.At, "radius 885.26") {
				t.Errorf("%s: %+v", e.Name, last)
			}
			// Bryan & Norman 1998 at Ω_m(z) = 0.3632: 18π² + 82x − 39x², x = Ω_m(z) − 1.
			if v := e.Own[4]; v.Of != "virial" || math.Abs(v.Overdensity-109.6) > 0.1 {
				t.Errorf("%s: %+v", e.Name, v)
			}
		}
		own := from == `"own"`
		first := w.Tensions[0]
		if (first.Radii == "own") != own {
			t.Errorf("from %s the ratio says %s", from, first.Radii)
		}
		// 400 draws of two masses with 10% errors know their ratio to 0.9%.
		if own && math.Abs(first.Ratio.Median/1.25-1) > 0.03 {
			t.Errorf("ratio at own radii %.3f, want 1.25", first.Ratio.Median)
		}
		// At one radius the ratio of the masses is closer to one: M(<R) of a halo
		// grows more slowly than M_Δ.
		if !own && !(first.Ratio.Median > 1.05 && first.Ratio.Median < 1.23) {
			t.Errorf("matched ratio %.3f", first.Ratio.Median)
		}
	}
}

// The text of a weighing names everything in it.
func TestTextNamesEverything(t *testing.T) {
	p := plan(t, fmt.Sprintf(reportedPair, "reported.a"), nil)
	w, err := p.Fill(context.Background(), execute(t, p))
	if err != nil {
		t.Fatal(err)
	}
	var b strings.Builder
	if err := w.WriteText(&b); err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{"Avocet at z = 0.1", "M_200m", "M_virial", "reported.a / reported.b", "extrapolated", "CONSISTENT"} {
		if !strings.Contains(strings.ToUpper(b.String()), strings.ToUpper(want)) {
			t.Errorf("%q is missing from\n%s", want, b.String())
		}
	}
	if w.Schema != weighing.Schema {
		t.Errorf("schema %q", w.Schema)
	}
}
