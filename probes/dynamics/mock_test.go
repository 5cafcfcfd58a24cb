package dynamics

import (
	"context"
	"testing"

	"steelyard/probes/catalogue"
	"steelyard/probes/cosmology"
	"steelyard/probes/estimate"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/mock"
)

// invented is the halo of these tests; its galaxies come from package mock,
// which shares nothing with the estimators but the constants.
var invented = mock.Truth{Redshift: 0.1, RA: 2.1, Dec: 0.4, HubbleConstant: 70, OmegaMatter: 0.3, M200: 8e14, C200: 4}

// within returns the angle of so many R200 of a truth.
func within(t mock.Truth, radii float64) float64 {
	return radii * t.R200() / t.AngularDiameter(t.Redshift)
}

func tableOf(c *mock.MotionCatalogue) *catalogue.Table {
	t := &catalogue.Table{File: "galaxies.csv"}
	for i := range c.RA {
		t.Rows = append(t.Rows, i+1)
	}
	for _, column := range []struct {
		name string
		v    []float64
	}{{"ra", c.RA}, {"dec", c.Dec}, {"redshift", c.Redshift}, {"error", c.Error}} {
		t.Columns = append(t.Columns, catalogue.Column{Name: column.name, Values: column.v})
	}
	return t
}

// weighing is a task about a truth, its members to be found by the named method.
func weighing(t testing.TB, truth mock.Truth, table *catalogue.Table, members string) *estimate.Task {
	t.Helper()
	c, err := cosmology.New(cosmology.Params{HubbleConstant: truth.HubbleConstant, OmegaMatter: truth.OmegaMatter, OmegaLambda: 1 - truth.OmegaMatter, W0: -1})
	if err != nil {
		t.Fatal(err)
	}
	return &estimate.Task{
		Name:      "dynamics.test.one",
		Object:    estimate.Object{Redshift: truth.Redshift, RA: truth.RA, Dec: truth.Dec, HasCentre: true},
		Cosmology: c,
		Tables:    map[string]*catalogue.Table{"galaxies": table},
		Blocks:    map[string]method.Settings{"members": {"method": method.Word(members)}},
		Sampling:  infer.Options{Draws: 1000, Stream: infer.NewStream("test")},
	}
}

// reduced runs the reduction and encodes it, as the graph does.
func reduced(t testing.TB, task *estimate.Task) (*Members, error) {
	t.Helper()
	m, err := reduceMembers(context.Background(), task)
	if err != nil {
		return nil, err
	}
	data, err := m.MarshalBinary()
	if err != nil {
		t.Fatal(err)
	}
	task.Reduced = map[string][]byte{"members": data}
	back := new(Members)
	if err := back.UnmarshalBinary(data); err != nil {
		t.Fatal(err)
	}
	return back, nil
}

// weigh runs one method with its defaults, changed by set.
func weigh(t testing.TB, task *estimate.Task, m estimate.Method, set method.Settings) (*infer.Draws, error) {
	t.Helper()
	settings := method.Settings{}
	for _, s := range m.Settings {
		settings[s.Name] = s.Default
	}
	for name, v := range set {
		settings[name] = v
	}
	copied := *task
	copied.Settings = settings
	return m.Run(context.Background(), &copied)
}
