package lensing

import (
	"bytes"
	"context"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"steelyard/probes/catalogue"
	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/mock"
)

func reduced(t testing.TB, task *estimate.Task) *Profile {
	t.Helper()
	p, err := reduce(context.Background(), task)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// TestReduceWithoutNoise compares the binned shear of an invented catalogue
// without shape noise with the exact shear of its sources, which mock
// integrated from the density: what remains is the spread of the shear within
// a bin, and the mean over sources to second order.
func TestReduceWithoutNoise(t *testing.T) {
	quiet := deep
	quiet.Galaxies, quiet.Quiet, quiet.Noisy = 40000, 1e-6, 2e-6
	c := curlew.Shapes(quiet, rand.New(rand.NewPCG(5, 6)))
	p := reduced(t, shapeTask(t, curlew, c))
	if len(p.Bins) != 10 {
		t.Fatalf("%d bins", len(p.Bins))
	}
	f := truthShear(t, p)
	for i, b := range p.Bins {
		// β scatters from source to source by 40% and so does g, of which a bin
		// averages hundreds; its ⟨β⟩ takes that scatter out. Second order leaves
		// κ² ~ 0.01 at 200 kpc.
		near(t, "shear", b.Shear, f[i], 0.006)
		if math.Abs(b.Cross) > 1e-6 {
			t.Errorf("bin %d: a cross shear of %.2g", i, b.Cross)
		}
		if !(b.Inner < b.Mean && b.Mean < b.Outer) || b.Sources == 0 || b.Weight == 0 {
			t.Errorf("bin %d: %+v", i, b)
		}
	}
}

// truthShear is the shear that the package expects of curlew in the bins.
func truthShear(t testing.TB, p *Profile) []float64 {
	t.Helper()
	out := make([]float64, len(p.Bins))
	s := signal{critical: background(t).SigmaCritical(curlew.Redshift, math.Inf(1)), bins: p.Bins, elongation: 1, distance: 1, response: 1}
	s.predict(halo.NewNFW(curlew.M200, curlew.C200, 200*background(t).CriticalDensity(curlew.Redshift)), out)
	return out
}

// TestErrorsFromDispersion compares the errors with the scatter of many
// catalogues, and with the known dispersion of the shapes.
func TestErrorsFromDispersion(t *testing.T) {
	const catalogues = 300
	faint := deep
	faint.Galaxies = 3000
	var pulls, cross, ratio float64
	n := 0
	for k := range catalogues {
		c := curlew.Shapes(faint, rand.New(rand.NewPCG(7, uint64(k))))
		p := reduced(t, shapeTask(t, curlew, c))
		expected := truthShear(t, p)
		for i, b := range p.Bins[2:] { // beyond the reach of the second order
			d := (b.Shear - expected[i+2]) / b.Plus
			pulls += d * d
			cross += b.Cross * b.Cross / (b.Plus * b.Plus)
			n++
		}
		// Weights of 1/σ² leave (Σ 1/σ²)^(−1/2).
		ratio += p.Bins[9].Plus * math.Sqrt(p.Bins[9].Weight) / catalogues
	}
	// The mean square of n pulls scatters by (2/n)^½; four of those.
	tolerance := 4 * math.Sqrt(2/float64(n))
	near(t, "mean square of the tangential pulls", pulls/float64(n), 1, tolerance)
	near(t, "mean square of the cross pulls", cross/float64(n), 1, tolerance)
	// The dispersion of 3000 galaxies scatters by (1/6000)^½ = 1.3%, the mean of
	// 300 by 0.08%; σ is up to 0.35, where the unit circle cuts off 1.7%.
	near(t, "error over that of the weights", ratio, 1, 0.01)
}

// TestHandedness mirrors a catalogue: the setting undoes it, and without the
// setting the cross shear does not notice but the signal does.
func TestHandedness(t *testing.T) {
	west := deep
	west.West = true
	c := curlew.Shapes(west, rand.New(rand.NewPCG(8, 9)))
	settings := defaults(tangentialShear)

	mirrored := shapeTask(t, curlew, c)
	p, d := fitted(t, mirrored, settings)
	if cross := p.crossCheck(); !cross.Passed {
		t.Errorf("the cross shear of a mirrored catalogue is %g with p = %g", cross.Statistic, cross.PValue)
	}
	if check := find(t, d, "best signal with a sign reversed"); check.Passed || check.Statistic < 8 {
		t.Errorf("mirrored: %+v", check)
	}
	if w := strings.Join(d.Warnings, "\n"); !strings.Contains(w, "sign of e2 reversed; set `handedness`") {
		t.Errorf("mirrored: warnings %q", w)
	}

	mirrored.Blocks["galaxies"] = method.Settings{"handedness": method.Word("west")}
	_, d = fitted(t, mirrored, settings)
	if check := find(t, d, "best signal with a sign reversed"); !check.Passed {
		t.Errorf("undone: %+v", check)
	}

	// Angles counted from north reverse e1.
	north := curlew.Shapes(deep, rand.New(rand.NewPCG(8, 9)))
	for i := range north.E1 {
		north.E1[i] = -north.E1[i]
	}
	_, d = fitted(t, shapeTask(t, curlew, north), settings)
	if w := strings.Join(d.Warnings, "\n"); !strings.Contains(w, "sign of e1 reversed") {
		t.Errorf("from north: warnings %q", w)
	}
}

func find(t testing.TB, d *infer.Draws, name string) infer.Check {
	t.Helper()
	for _, c := range d.Checks {
		if c.Name == name {
			return c
		}
	}
	t.Fatalf("no check %q", name)
	return infer.Check{}
}

// TestWorkers reduces with different numbers of workers: the same bytes.
func TestWorkers(t *testing.T) {
	many := deep
	many.Galaxies = 5*chunk + 17
	task := shapeTask(t, curlew, curlew.Shapes(many, rand.New(rand.NewPCG(10, 11))))
	var first []byte
	for _, workers := range []int{1, 2, 7} {
		task.Sampling.Workers = workers
		b, err := reduced(t, task).MarshalBinary()
		if err != nil {
			t.Fatal(err)
		}
		if first == nil {
			first = b
		} else if !bytes.Equal(first, b) {
			t.Errorf("%d workers give other bytes", workers)
		}
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := reduce(ctx, task); err != context.Canceled {
		t.Errorf("cancelled: %v", err)
	}
}

// TestBadCatalogues hands in what should be refused, each with a message that
// names the file and the row.
func TestBadCatalogues(t *testing.T) {
	few := deep
	few.Galaxies = 2000
	fresh := func() (*estimate.Task, *mock.ShapeCatalogue) {
		c := curlew.Shapes(few, rand.New(rand.NewPCG(12, 13)))
		return shapeTask(t, curlew, c), c
	}
	columns := func(task *estimate.Task, name string) []float64 { return task.Tables["galaxies"].Values(name) }
	for _, x := range []struct {
		name  string
		spoil func(*estimate.Task)
		says  []string
	}{
		{"ellipticity above 1", func(k *estimate.Task) { columns(k, "e1")[41] = 1.2 }, []string{"shapes.fits", "row 42", "ellipticity of 1.2", "select"}},
		{"ellipticity not a number", func(k *estimate.Task) { columns(k, "e2")[6] = math.NaN() }, []string{"shapes.fits, row 7", "ellipticity"}},
		{"negative weight", func(k *estimate.Task) { columns(k, "weight")[9] = -1 }, []string{"shapes.fits, row 10", "weight"}},
		{"weights of zero", func(k *estimate.Task) { clear(columns(k, "weight")) }, []string{"shapes.fits", "every weight is zero"}},
		{"degrees read as radians", func(k *estimate.Task) {
			for i := range columns(k, "dec") {
				columns(k, "dec")[i] *= 180 / math.Pi
			}
		}, []string{"shapes.fits, row 1: declination"}},
		{"no redshift known", func(k *estimate.Task) { columns(k, "redshift")[3] = -99 }, []string{"shapes.fits, row 4", "-99", "select"}},
		{"all in front", func(k *estimate.Task) {
			for i := range columns(k, "redshift") {
				columns(k, "redshift")[i] = 0.2
			}
		}, []string{"shapes.fits", "all 2000 sources lie in front of the lens at redshift 0.25"}},
		{"all at the lens", func(k *estimate.Task) {
			for i := range columns(k, "redshift") {
				columns(k, "redshift")[i] = 0.25
			}
		}, []string{"in front"}},
		{"centre elsewhere", func(k *estimate.Task) { k.Object.RA += 0.02 }, []string{"outside the field of shapes.fits", "centre"}},
		{"no centre", func(k *estimate.Task) { k.Object.HasCentre = false }, []string{"centre"}},
		{"no bins", func(k *estimate.Task) { delete(k.Blocks, "bins") }, []string{"bins"}},
		{"no galaxies", func(k *estimate.Task) {
			k.Tables["galaxies"] = &catalogue.Table{File: "shapes.fits", Columns: []catalogue.Column{column("ra", "rad")}}
		}, []string{"shapes.fits", "no galaxy"}},
		{"bins beyond the field", func(k *estimate.Task) { k.Blocks["bins"] = logBins(2e4, 3e4, 5) }, []string{"shapes.fits", "2e+04 to 3e+04 kpc"}},
		{"bins with two in the field", func(k *estimate.Task) { k.Blocks["bins"] = logBins(2500, 30000, 10) }, []string{"shapes.fits: only 2 of 10 bins"}},
		{"a copied row", func(k *estimate.Task) {
			for _, c := range k.Tables["galaxies"].Columns {
				c.Values[900] = c.Values[30]
			}
		}, []string{"shapes.fits, rows 31 and 901 are one galaxy"}},
		{"redshifts twice", func(k *estimate.Task) { k.Blocks["galaxies"]["source_redshift"] = method.Exactly(1) }, []string{"twice"}},
		{"no redshifts", func(k *estimate.Task) {
			g := k.Tables["galaxies"]
			g.Columns = g.Columns[:5]
		}, []string{"galaxies", "source_redshift"}},
		{"profile too", func(k *estimate.Task) { k.Tables["profile"] = k.Tables["galaxies"] }, []string{"twice"}},
		{"nothing", func(k *estimate.Task) { delete(k.Tables, "galaxies") }, []string{"no shear"}},
	} {
		task, _ := fresh()
		x.spoil(task)
		_, err := profileReduction.Run(context.Background(), task)
		refused(t, x.name, err, append(x.says, "lensing.shapes: ")...)
	}
	// Three galaxies.
	task, c := fresh()
	task.Tables["galaxies"] = table("three.csv", column("ra", "rad", c.RA[:3]...), column("dec", "rad", c.Dec[:3]...),
		column("e1", "", c.E1[:3]...), column("e2", "", c.E2[:3]...), column("redshift", "", c.Redshift[:3]...))
	_, err := profileReduction.Run(context.Background(), task)
	refused(t, "three galaxies", err, "three.csv")
}

// TestOddCatalogues hands in what is strange but usable.
func TestOddCatalogues(t *testing.T) {
	few := deep
	few.Galaxies = 2000
	c := curlew.Shapes(few, rand.New(rand.NewPCG(12, 13)))
	whole := reduced(t, shapeTask(t, curlew, c))

	// A weight of zero is a galaxy left out.
	task := shapeTask(t, curlew, c)
	w := task.Tables["galaxies"].Values("weight")
	for i := range w {
		if i%2 == 0 {
			w[i] = 0
		}
	}
	half := reduced(t, task)
	if n := half.Bins[9].Sources; n == 0 || n >= whole.Bins[9].Sources {
		t.Errorf("%d sources of %d with half the weights zero", n, whole.Bins[9].Sources)
	}

	// The same position with another shape is said.
	task = shapeTask(t, curlew, curlew.Shapes(few, rand.New(rand.NewPCG(12, 13))))
	for _, name := range []string{"ra", "dec"} {
		v := task.Tables["galaxies"].Values(name)
		v[500] = v[20]
	}
	if w := strings.Join(reduced(t, task).Warnings, "\n"); !strings.Contains(w, "shapes.fits: 1 galaxies stand exactly where another does") || !strings.Contains(w, "row 501") {
		t.Errorf("two shapes at one place: %q", w)
	}

	// An empty bin is left out and said.
	task.Blocks["bins"] = method.Settings{"edges": {Set: true, Unit: "kpc", Numbers: []float64{1e-3, 2e-3, 500, 1000, 2000}}}
	p := reduced(t, task)
	if w := strings.Join(p.Warnings, "\n"); len(p.Bins) != 3 || !strings.Contains(w, "no galaxy between 0.001 and 0.002 kpc") {
		t.Errorf("%d bins, warnings %q", len(p.Bins), w)
	}

	// Right ascension counted from −π.
	shifted := shapeTask(t, curlew, curlew.Shapes(few, rand.New(rand.NewPCG(12, 13))))
	for i := range shifted.Tables["galaxies"].Values("ra") {
		shifted.Tables["galaxies"].Values("ra")[i] -= 2 * math.Pi
	}
	for i, b := range reduced(t, shifted).Bins {
		near(t, "shear", b.Shear, whole.Bins[i].Shear, 1e-9) // rounding of the angles
	}
}

// TestEffectiveRedshift reduces without a redshift a galaxy.
func TestEffectiveRedshift(t *testing.T) {
	few := deep
	few.Galaxies = 2000
	c := curlew.Shapes(few, rand.New(rand.NewPCG(12, 13)))
	task := shapeTask(t, curlew, c)
	g := task.Tables["galaxies"]
	g.Columns = g.Columns[:5]
	task.Blocks["galaxies"]["source_redshift"] = method.Exactly(0.8)
	beta := newEfficiencies(background(t), curlew.Redshift, 0).exact(0.8)
	for _, b := range reduced(t, task).Bins {
		near(t, "⟨β⟩", b.Beta, beta, 1e-14)
		near(t, "⟨β²⟩", b.Beta2, beta*beta, 1e-14)
	}
	delete(task.Blocks["galaxies"], "source_redshift")
	task.Tables["galaxies.sources"] = table("nz.csv", column("redshift", "", 0.1, 0.8), column("weight", "", 1, 3))
	for _, b := range reduced(t, task).Bins {
		near(t, "⟨β⟩", b.Beta, 0.75*beta, 1e-14)
		near(t, "⟨β²⟩", b.Beta2, 0.75*beta*beta, 1e-14)
	}
}

// TestCalibration undoes what was done to the shapes of a catalogue.
func TestCalibration(t *testing.T) {
	few := deep
	few.Galaxies = 3000
	few.Quiet, few.Noisy = 0.1, 0.2
	plain := reduced(t, shapeTask(t, curlew, curlew.Shapes(few, rand.New(rand.NewPCG(14, 15)))))
	c := curlew.Shapes(few, rand.New(rand.NewPCG(14, 15)))
	bias := make([]float64, len(c.E1))
	for i := range bias {
		bias[i] = -0.1
		c.E1[i] = 0.9*0.8*c.E1[i] + 0.01
		c.E2[i] = 0.9*0.8*c.E2[i] - 0.02
	}
	task := shapeTask(t, curlew, c)
	g := task.Tables["galaxies"]
	g.Columns = append(g.Columns, column("multiplicative", "", bias...))
	task.Blocks["galaxies"]["additive_e1"] = method.Exactly(0.01)
	task.Blocks["galaxies"]["additive_e2"] = method.Exactly(-0.02)
	task.Blocks["galaxies"]["responsivity"] = method.Exactly(0.8)
	for i, b := range reduced(t, task).Bins {
		near(t, "shear", b.Shear, plain.Bins[i].Shear, 1e-9) // rounding of small means
		near(t, "error", b.Plus, plain.Bins[i].Plus, 1e-9)
		near(t, "turned", b.Turned, plain.Bins[i].Turned, 1e-9)
	}
	bias[7] = -1
	_, err := reduce(context.Background(), task)
	refused(t, "no response", err, "shapes.fits, row 8", "multiplicative")
}

// TestTurned turns the shapes of a catalogue at random, many times, and compares
// the scatter of the shear with what the reduction says it would be.
func TestTurned(t *testing.T) {
	few := deep
	few.Galaxies = 1500
	rng := rand.New(rand.NewPCG(16, 17))
	c := curlew.Shapes(few, rng)
	task := shapeTask(t, curlew, c)
	task.Blocks["bins"] = logBins(300, 3000, 3)
	said := reduced(t, task).Bins
	const times = 400
	square := make([]float64, 3)
	for range times {
		for i := range c.E1 {
			s, k := math.Sincos(2 * math.Pi * rng.Float64())
			c.E1[i], c.E2[i] = k*c.E1[i]-s*c.E2[i], s*c.E1[i]+k*c.E2[i]
		}
		for i, b := range reduced(t, task).Bins {
			square[i] += b.Shear * b.Shear / times
		}
	}
	for i, b := range said {
		// The variance of 400 scatters by (2/400)^½; four of those, half for σ.
		near(t, "scatter of turned shapes", math.Sqrt(square[i]), b.Turned, 2*math.Sqrt(2.0/times))
	}
}

func TestBinEdges(t *testing.T) {
	span := func(numbers ...float64) method.Value { return method.Value{Set: true, Unit: "kpc", Numbers: numbers} }
	for _, x := range []struct {
		name string
		s    method.Settings
		says string
	}{
		{"nothing", method.Settings{}, "needed together"},
		{"half", method.Settings{"from": number(1, "kpc")}, "needed together"},
		{"both", method.Settings{"from": number(1, "kpc"), "edges": span(1, 2, 3, 4)}, "not both"},
		{"two bins", logBins(1, 2, 2), "at least 3 bins"},
		{"from zero", logBins(0, 2, 4), "above zero"},
		{"backwards", logBins(3, 2, 4), "beyond `from`"},
		{"too few edges", method.Settings{"edges": span(1, 2, 3)}, "at least 3 bins"},
		{"edges from zero", method.Settings{"edges": span(0, 1, 2, 3)}, "above zero"},
		{"unsorted edges", method.Settings{"edges": span(1, 3, 2, 4)}, "edge 3"},
	} {
		_, err := binEdges(x.s)
		refused(t, x.name, err, x.says)
	}
	edges, err := binEdges(logBins(200, 3200, 4))
	if err != nil {
		t.Fatal(err)
	}
	for i, want := range []float64{200, 400, 800, 1600, 3200} {
		near(t, "edge", edges[i], want, 1e-14)
	}
	edges, err = binEdges(method.Settings{"edges": span(1, 2, 3, 5)})
	if err != nil || len(edges) != 4 || edges[3] != 5 {
		t.Errorf("edges: %v, %v", edges, err)
	}
}
