package lensing

import (
	"context"
	"fmt"
	"math"
	"os"
	"testing"

	"steelyard/probes/catalogue"
	"steelyard/probes/estimate"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/mock"
	"steelyard/probes/prior"
)

// arcs are five invented families about an invented lens.
var arcs = mock.Arcs{
	Redshifts: []float64{0.9, 1.4, 2.1, 2.9, 4.2}, Error: 0.2 * arcsec,
	Ellipticity: [2]float64{0.08, -0.05}, Shear: [2]float64{0.02, 0.03}, Centre: [2]float64{6, -4},
	Fewest: 3, FaintestFactor: 0.3,
}

// dense is an invented lens whose arcs are wide.
var dense = mock.Truth{
	Name: "Curlew", Redshift: 0.25, RA: 0.0001, Dec: 0.4,
	HubbleConstant: 70, OmegaMatter: 0.3, M200: 1.2e15, C200: 7,
}

func imagesTask(t testing.TB, truth mock.Truth, c *mock.ArcCatalogue, sigma float64) *estimate.Task {
	names := make([]string, len(c.RA))
	errors := make([]float64, len(c.RA))
	for i, k := range c.Source {
		names[i], errors[i] = fmt.Sprintf("source %d", k), sigma
	}
	task := &estimate.Task{
		Name:      "lensing.arcs.images",
		Object:    estimate.Object{Name: truth.Name, Redshift: truth.Redshift, RA: truth.RA, Dec: truth.Dec, HasCentre: true},
		Cosmology: background(t),
		Settings:  defaults(imagePositions),
		Tables: map[string]*catalogue.Table{"images": table("arcs.csv",
			column("ra", "rad", c.RA...), column("dec", "rad", c.Dec...), column("error", "rad", errors...), column("redshift", "", c.Redshift...),
			catalogue.Column{Name: "source", Text: names})},
		Sampling: infer.Options{Workers: 2, Stream: infer.NewStream("images")},
	}
	p, err := prior.LogUniform(1, 30)
	if err != nil {
		t.Fatal(err)
	}
	task.Settings["concentration"] = method.Value{Set: true, Prior: p}
	return task
}

func reduceImages(t testing.TB, task *estimate.Task) {
	t.Helper()
	reduced, err := imagesReduction.Run(context.Background(), task)
	if err != nil {
		t.Fatal(err)
	}
	bytes, err := reduced.MarshalBinary()
	if err != nil {
		t.Fatal(err)
	}
	if task.Reduced == nil {
		task.Reduced = map[string][]byte{}
	}
	task.Reduced["images"] = bytes
}

// weighImages reduces the images and fits them.
func weighImages(t testing.TB, task *estimate.Task) *infer.Draws {
	t.Helper()
	reduceImages(t, task)
	d, err := imagePositions.Run(context.Background(), task)
	if err != nil {
		t.Fatal(err)
	}
	return d
}

// holds fails unless the truth lies within four standard deviations of the
// draws' median: one in 16000 does not, where the draws are normal.
func holds(t testing.TB, d *infer.Draws, name string, truth float64) {
	t.Helper()
	p := d.Parameter(name)
	if p == nil {
		t.Fatalf("there is no %s", name)
	}
	m := infer.Percentiles(p.Values, 16, 50, 84)
	if sd := (m[2] - m[0]) / 2; math.Abs(m[1]-truth) > 4*sd {
		t.Errorf("%s = %.4g ± %.2g, truth %.4g", name, m[1], sd, truth)
	}
}

// Three families of a known elliptical lens, made by another route, give it back
// to within the errors, and the images to within the astrometric error.
func TestImagesRecoverALens(t *testing.T) {
	a := arcs
	a.Redshifts, a.Shear, a.Centre = a.Redshifts[:3], [2]float64{}, [2]float64{}
	task := imagesTask(t, dense, dense.Arcs(a, infer.NewStream("arcs").Rand(0)), a.Error)
	task.Settings["external_shear"], task.Settings["centre_error"] = number(0, ""), number(0, "kpc")
	task.Sampling.Draws = 1000
	d := weighImages(t, task)
	holds(t, d, "mass_200c", dense.M200)
	holds(t, d, "concentration", dense.C200)
	holds(t, d, "ellipticity_1", a.Ellipticity[0])
	holds(t, d, "ellipticity_2", a.Ellipticity[1])
	if !d.Quality.Converged {
		t.Errorf("not converged: %+v", d.Quality)
	}
	if d.Quality.PValue < 1e-3 || d.Quality.PValue > 0.999 {
		t.Errorf("χ² = %.1f for %d", d.Quality.Chi2, d.Quality.Dof)
	}
	for _, c := range d.Checks {
		if !c.Passed {
			t.Errorf("%+v", c)
		}
		// Two coordinates, less what the fit takes up.
		if c.Name == "rms of the images" && !(c.Statistic > 0.3*a.Error/arcsec && c.Statistic < 1.5*math.Sqrt2*a.Error/arcsec) {
			t.Errorf("rms %.3g arcsec at errors of %.3g", c.Statistic, a.Error/arcsec)
		}
	}
	if d.Covers[0] >= d.Covers[1] || d.Covers[1] > 300 {
		t.Errorf("covers %v kpc", d.Covers)
	}
}

// The whole of the model, five families.
func TestFiveFamilies(t *testing.T) {
	if os.Getenv("STEELYARD_SLOW") == "" {
		t.Skip("takes ten seconds and more: set STEELYARD_SLOW=1")
	}
	d := weighImages(t, imagesTask(t, dense, dense.Arcs(arcs, infer.NewStream("arcs").Rand(0)), arcs.Error))
	for name, truth := range map[string]float64{
		"mass_200c": dense.M200, "concentration": dense.C200, "centre_east": arcs.Centre[0], "centre_north": arcs.Centre[1],
		"ellipticity_1": arcs.Ellipticity[0], "ellipticity_2": arcs.Ellipticity[1],
		"external_shear_1": arcs.Shear[0], "external_shear_2": arcs.Shear[1],
	} {
		holds(t, d, name, truth)
	}
}

func BenchmarkFiveFamilies(b *testing.B) {
	task := imagesTask(b, dense, dense.Arcs(arcs, infer.NewStream("arcs").Rand(0)), arcs.Error)
	reduceImages(b, task)
	for b.Loop() {
		if _, err := imagePositions.Run(context.Background(), task); err != nil {
			b.Fatal(err)
		}
	}
}

// Shear and images of one halo are fitted together.
func TestShearWithImages(t *testing.T) {
	a := arcs
	a.Redshifts, a.Shear, a.Centre, a.Ellipticity = a.Redshifts[:3], [2]float64{}, [2]float64{}, [2]float64{}
	task := imagesTask(t, dense, dense.Arcs(a, infer.NewStream("round").Rand(0)), a.Error)
	reduceImages(t, task)
	shear := shapeTask(t, dense, dense.Shapes(deep, infer.NewStream("shapes").Rand(0)))
	reduced, err := profileReduction.Run(context.Background(), shear)
	if err != nil {
		t.Fatal(err)
	}
	if task.Reduced["profile"], err = reduced.MarshalBinary(); err != nil {
		t.Fatal(err)
	}
	images := task.Settings
	task.Settings = defaults(combined)
	task.Settings["concentration"] = images["concentration"]
	for _, name := range []string{"external_shear", "centre_error", "ellipticity"} {
		task.Settings[name] = number(0, "")
	}
	task.Sampling.Draws = 1000
	d, err := combined.Run(context.Background(), task)
	if err != nil {
		t.Fatal(err)
	}
	holds(t, d, "mass_200c", dense.M200)
	holds(t, d, "concentration", dense.C200)
	if d.Covers[1] < 2900 || d.Covers[0] > 200 {
		t.Errorf("covers %v kpc, not shear and images both", d.Covers)
	}
	task.Settings["source_redshift"] = number(2, "")
	_, err = combined.Run(context.Background(), task)
	refused(t, "images and a radius", err, "given twice", "images", "radius")
	delete(task.Settings, "source_redshift")
	delete(task.Reduced, "images")
	_, err = combined.Run(context.Background(), task)
	refused(t, "neither", err, "no strong lensing", "radius", "images")
}

// The families are read alike wherever the lens stands: on the equator, across
// right ascension zero, beside the pole.
func TestImagesAnywhere(t *testing.T) {
	var first *Images
	two := arcs
	two.Redshifts = two.Redshifts[:2]
	for _, at := range [][2]float64{{3, 0}, {0.00001, 0.3}, {2*math.Pi - 0.00001, -0.7}, {1, math.Pi/2 - 0.00002}} {
		truth := dense
		truth.RA, truth.Dec = at[0], at[1]
		m, err := readImages(imagesTask(t, truth, truth.Arcs(two, infer.NewStream("arcs").Rand(0)), arcs.Error))
		if err != nil {
			t.Fatal(err)
		}
		if first == nil {
			first = m
			continue
		}
		for k, f := range m.Families {
			for i, image := range f.Images {
				other := first.Families[k].Images[i]
				// The angles are kept to 1e-15 of a radian.
				if math.Hypot(image.X-other.X, image.Y-other.Y) > 1e-6*arcsec {
					t.Errorf("at %v image %d of family %d is at %v, not %v", at, i, k, image, other)
				}
			}
		}
	}
}

func TestBadImages(t *testing.T) {
	fresh := func() *estimate.Task {
		at := func(east, north float64) (ra, dec float64) {
			return dense.RA + east*arcsec/math.Cos(dense.Dec), dense.Dec + north*arcsec
		}
		c := new(mock.ArcCatalogue)
		for i, p := range [][2]float64{{20, 3}, {-25, 1}, {2, 30}, {1, -22}} {
			ra, dec := at(p[0], p[1])
			c.RA, c.Dec = append(c.RA, ra), append(c.Dec, dec)
			c.Source, c.Redshift = append(c.Source, i/2), append(c.Redshift, []float64{2, 1.2}[i/2])
		}
		return imagesTask(t, dense, c, 0.3*arcsec)
	}
	values := func(task *estimate.Task, name string) []float64 { return task.Tables["images"].Values(name) }
	for _, c := range []struct {
		name  string
		spoil func(*estimate.Task)
		words []string
	}{
		{"no centre", func(k *estimate.Task) { k.Object.HasCentre = false }, []string{"centre"}},
		{"no error", func(k *estimate.Task) { values(k, "error")[2] = 0 }, []string{"arcs.csv, row 3", "error"}},
		{"in front", func(k *estimate.Task) { values(k, "redshift")[1] = 0.2 }, []string{"row 2", "not behind"}},
		{"two redshifts", func(k *estimate.Task) { values(k, "redshift")[1] = 2.2 }, []string{"row 2", "source 0", "2.2"}},
		{"twice", func(k *estimate.Task) {
			values(k, "ra")[3], values(k, "dec")[3] = values(k, "ra")[2], values(k, "dec")[2]
		}, []string{"row 4", "already"}},
		{"no source", func(k *estimate.Task) { k.Tables["images"].Column("source").Text[0] = "" }, []string{"row 1", "source"}},
		{"alone", func(k *estimate.Task) { k.Tables["images"].Column("source").Text[0] = "x" }, []string{"one image", "x"}},
		{"elsewhere", func(k *estimate.Task) { k.Object.RA += 0.1 }, []string{"row 1", "arcmin", "centre"}},
		{"beyond the pole", func(k *estimate.Task) { values(k, "dec")[0] = 2 }, []string{"row 1", "declination"}},
		{"dark component", func(k *estimate.Task) {
			k.Tables["components"] = table("members.csv", column("ra", "rad", dense.RA), column("dec", "rad", dense.Dec), column("luminosity", "", 0))
		}, []string{"members.csv, row 1", "luminosity"}},
		{"half a shape", func(k *estimate.Task) {
			k.Tables["components"] = table("members.csv", column("ra", "rad", dense.RA), column("dec", "rad", dense.Dec), column("ellipticity", "", 0.1))
		}, []string{"members.csv", "position_angle"}},
	} {
		task := fresh()
		if _, err := imagesReduction.Run(context.Background(), task); err != nil {
			t.Fatal(err)
		}
		c.spoil(task)
		_, err := imagesReduction.Run(context.Background(), task)
		refused(t, c.name, err, c.words...)
	}
}

func TestImagesEncodeExactly(t *testing.T) {
	m := &Images{
		Families: []Family{
			{"a", 1.5, []Image{{1e-4, -2e-4, 1e-6}, {-1e-4, 2e-4, 2e-6}}},
			{"β", 3, []Image{{0, 1, 2}, {3, 4, 5}, {6, 7, 8}}},
		},
		Components: []Component{{1, 2, 0.1, -0.1, 0.5}},
	}
	bytes, err := m.MarshalBinary()
	if err != nil {
		t.Fatal(err)
	}
	back := new(Images)
	if err := back.UnmarshalBinary(bytes); err != nil {
		t.Fatal(err)
	}
	if fmt.Sprint(*m) != fmt.Sprint(*back) {
		t.Errorf("%v came back as %v", m, back)
	}
	for n := range bytes {
		if new(Images).UnmarshalBinary(bytes[:n]) == nil {
			t.Errorf("the first %d of %d bytes were accepted", n, len(bytes))
		}
	}
}
