package lensing

import (
	"context"
	"encoding/json"
	"math"
	"os"
	"strings"
	"testing"

	"steelyard/probes/catalogue"
	"steelyard/probes/cosmology"
	"steelyard/probes/estimate"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/mock"
	"steelyard/probes/prior"
)

// reference holds the figures of testdata/lensing/shear.json, which names their
// source.
type reference struct {
	Halo struct {
		Redshift, M200c, C200c float64
	}
	BetaInfinity                 float64 `json:"beta_infinity"`
	Discrete, Smooth, Background struct {
		MeanBeta  float64 `json:"mean_beta"`
		MeanBeta2 float64 `json:"mean_beta2"`
		Z, Weight []float64
		Rows      []struct {
			R      float64
			Kappa  float64 `json:"kappa_beta1"`
			Gamma  float64 `json:"gamma_beta1"`
			Exact  float64 `json:"g_exact_average"`
			Second float64 `json:"g_SeitzSchneider97"`
		}
	}
	Annuli []struct {
		R1, R2        float64
		Excess        float64 `json:"area_mean_DeltaSigma"`
		MeanOfSurface float64 `json:"area_mean_Sigma"`
	}
	Components []struct {
		X, Y, E1, E2 float64
		Tangential   float64 `json:"e_t"`
		Cross        float64 `json:"e_x"`
	}
	SinglePlane []struct {
		R, Zs, Kappa float64
		Gamma        float64 `json:"gamma_t"`
		G            float64 `json:"g_t"`
	} `json:"single_plane"`
}

func readReference(t testing.TB) *reference {
	t.Helper()
	data, err := os.ReadFile("../../testdata/lensing/shear.json")
	if err != nil {
		t.Fatal(err)
	}
	r := new(reference)
	if err := json.Unmarshal(data, r); err != nil {
		t.Fatal(err)
	}
	return r
}

// near fails unless got agrees with want to a relative tolerance.
func near(t testing.TB, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance*math.Abs(want)) {
		t.Errorf("%s = %.16g, want %.16g (off by %.1g)", what, got, want, got/want-1)
	}
}

// refused fails unless err says all the words.
func refused(t testing.TB, what string, err error, words ...string) {
	t.Helper()
	if err == nil {
		t.Errorf("%s: accepted", what)
		return
	}
	for _, w := range words {
		if !strings.Contains(err.Error(), w) {
			t.Errorf("%s: %q does not say %q", what, err, w)
		}
	}
}

func background(t testing.TB) *cosmology.Cosmology {
	t.Helper()
	c, err := cosmology.New(cosmology.Params{HubbleConstant: 70, OmegaMatter: 0.3, OmegaLambda: 0.7, W0: -1})
	if err != nil {
		t.Fatal(err)
	}
	return c
}

// defaults are the settings of a method where a recipe says nothing but the
// covariance.
func defaults(m estimate.Method) method.Settings {
	s := method.Settings{"covariance": method.Words("shape")}
	for _, d := range m.Settings {
		if d.Default.Set {
			v := d.Default
			v.Unit = d.Unit
			s[d.Name] = v
		}
	}
	return s
}

func number(x float64, unit string) method.Value {
	return method.Value{Set: true, Prior: prior.Exact(x), Unit: unit}
}

func logBins(from, to float64, count int) method.Settings {
	return method.Settings{"from": number(from, "kpc"), "to": number(to, "kpc"), "count": number(float64(count), "")}
}

func table(file string, columns ...catalogue.Column) *catalogue.Table {
	t := &catalogue.Table{File: file, Columns: columns}
	for i := range columns[0].Values {
		t.Rows = append(t.Rows, i+1)
	}
	return t
}

func column(name, unit string, values ...float64) catalogue.Column {
	return catalogue.Column{Name: name, Unit: unit, Values: values}
}

// curlew is an invented lens.
var curlew = mock.Truth{
	Name: "Curlew", Redshift: 0.25, RA: 3.67, Dec: 0.05,
	HubbleConstant: 70, OmegaMatter: 0.3, M200: 8e14, C200: 4.5,
}

var deep = mock.Shapes{
	Galaxies: 12000, Field: 15.0 / 60 * math.Pi / 180,
	RedshiftScale: 0.6, Quiet: 0.15, Noisy: 0.35,
}

// shapeTask is the reduction of an invented catalogue.
func shapeTask(t testing.TB, truth mock.Truth, c *mock.ShapeCatalogue) *estimate.Task {
	return &estimate.Task{
		Name:      "lensing.shapes",
		Object:    estimate.Object{Name: truth.Name, Redshift: truth.Redshift, RA: truth.RA, Dec: truth.Dec, HasCentre: true},
		Cosmology: background(t),
		Blocks: map[string]method.Settings{
			"galaxies": {"handedness": method.Word("east")},
			"bins":     logBins(200, 3000, 10),
		},
		Tables: map[string]*catalogue.Table{"galaxies": table("shapes.fits",
			column("ra", "rad", c.RA...), column("dec", "rad", c.Dec...),
			column("e1", "", c.E1...), column("e2", "", c.E2...),
			column("weight", "", c.Weight...), column("redshift", "", c.Redshift...))},
		Sampling: infer.Options{Workers: 2},
	}
}

// fitted reduces the task and fits the profile with the settings.
func fitted(t testing.TB, task *estimate.Task, settings method.Settings) (*Profile, *infer.Draws) {
	t.Helper()
	reduced, err := profileReduction.Run(context.Background(), task)
	if err != nil {
		t.Fatal(err)
	}
	bytes, err := reduced.MarshalBinary()
	if err != nil {
		t.Fatal(err)
	}
	fit := *task
	fit.Settings = settings
	fit.Reduced = map[string][]byte{"profile": bytes}
	fit.Sampling.Stream = infer.NewStream(task.Name)
	d, err := tangentialShear.Run(context.Background(), &fit)
	if err != nil {
		t.Fatal(err)
	}
	return reduced.(*Profile), d
}
