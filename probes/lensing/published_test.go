package lensing

import (
	"context"
	"math"
	"slices"
	"testing"

	"steelyard/probes/catalogue"
	"steelyard/probes/estimate"
	"steelyard/probes/method"
)

// profileTask is the reduction of a profile of five bins.
func profileTask(t testing.TB, more ...catalogue.Column) *estimate.Task {
	return &estimate.Task{
		Name: "lensing.shear", Object: estimate.Object{Redshift: 0.25}, Cosmology: background(t),
		Blocks: map[string]method.Settings{"profile": {"source_redshift": method.Exactly(1)}},
		Tables: map[string]*catalogue.Table{"profile": table("shear.csv", append([]catalogue.Column{
			column("inner", "kpc", 100, 200, 400, 800, 1600), column("outer", "kpc", 200, 400, 800, 1600, 3000),
			column("value", "", 0.2, 0.15, 0.1, 0.05, 0.02)}, more...)...)},
	}
}

func TestReadProfile(t *testing.T) {
	beta := newEfficiencies(background(t), 0.25, 0).exact(1)
	for _, x := range []struct {
		name   string
		errors []catalogue.Column
	}{
		{"error", []catalogue.Column{column("error", "", 0.02, 0.02, 0.02, 0.02, 0.02)}},
		{"minus and plus", []catalogue.Column{column("minus", "", 0.02, 0.02, 0.02, 0.02, 0.02), column("plus", "", 0.02, 0.02, 0.02, 0.02, 0.03)}},
		{"low and high", []catalogue.Column{column("low", "", 0.18, 0.13, 0.08, 0.03, 0), column("high", "", 0.22, 0.17, 0.12, 0.07, 0.05)}},
	} {
		p := reduced(t, profileTask(t, x.errors...))
		if len(p.Bins) != 5 || p.HasCross || p.Counted || p.Covariance != nil {
			t.Fatalf("%s: %+v", x.name, p)
		}
		plus := 0.03
		if x.name == "error" {
			plus = 0.02
		}
		b := p.Bins[4]
		near(t, x.name+": minus", b.Minus, 0.02, 1e-12) // a difference of decimals
		near(t, x.name+": plus", b.Plus, plus, 1e-12)
		near(t, x.name+": ⟨β²⟩", b.Beta2, beta*beta, 1e-14)
		// The mean radius of an even annulus: ⅔ (b³−a³)/(b²−a²).
		near(t, x.name+": mean radius", b.Mean, 2.0/3*(27e9-1600*1600*1600)/(9e6-1600*1600), 1e-14)
		if b.Inner != 1600 || b.Outer != 3000 || b.Shear != 0.02 {
			t.Errorf("%s: %+v", x.name, b)
		}
	}

	// At quoted radii, as angles, with a cross component.
	task := profileTask(t)
	angle := 1 / task.Cosmology.AngularDiameter(0.25)
	task.Tables["profile"] = table("shear.csv", column("radius", "rad", 100*angle, 300*angle, 900*angle), column("value", "", 0.2, 0.1, 0.05),
		column("error", "", 0.02, 0.02, 0.02), column("cross", "", 0.01, -0.02, 0.03))
	p := reduced(t, task)
	if !p.HasCross || p.Bins[2].Cross != 0.03 || len(p.Bins[1].Nodes) != 1 {
		t.Errorf("%+v", p)
	}
	near(t, "radius", p.Bins[1].Nodes[0].Radius, 300, 1e-14)
	near(t, "χ² of the cross shear", p.crossCheck().Statistic, (1+4+9)/4.0, 1e-12)
}

func TestReadCovariance(t *testing.T) {
	task := profileTask(t, column("error", "", 1, 1, 1, 1, 1))
	task.Tables["profile.covariance"] = table("cov.csv",
		column("first", "", 1, 2, 3, 4, 5, 1, 2), column("second", "", 1, 2, 3, 4, 5, 2, 1),
		column("value", "", 4e-4, 4e-4, 4e-4, 9e-4, 4e-4, 1e-4, 1e-4))
	p := reduced(t, task)
	near(t, "error of bin 4", p.Bins[3].Plus, 0.03, 1e-14)
	// The same as a matrix.
	var columns []catalogue.Column
	for j := range 5 {
		columns = append(columns, column(string(rune('a'+j)), "", p.Covariance[5*j:5*j+5]...))
	}
	task.Tables["profile.covariance"] = table("matrix.csv", columns...)
	if q := reduced(t, task); !slices.Equal(p.Covariance, q.Covariance) {
		t.Errorf("as a matrix %v, by pairs %v", q.Covariance, p.Covariance)
	}
	task.Tables["profile.covariance"] = table("matrix.csv", columns[:4]...)
	_, err := reduce(context.Background(), task)
	refused(t, "not square", err, "matrix.csv", "5 rows of 4 columns")
	columns[4].Values = []float64{1, 0, 0, 0, 4e-4}
	task.Tables["profile.covariance"] = table("matrix.csv", columns...)
	_, err = reduce(context.Background(), task)
	refused(t, "not symmetric", err, "matrix.csv, row 5", "the other way round")

	m := newMeasure(p, nil)
	// Two correlated bins and three others by hand.
	d := []float64{0.01, -0.02, 0.03, 0.03, 0.01}
	expected := make([]float64, 5)
	for i := range d {
		expected[i] = p.Bins[i].Shear + d[i]
	}
	a, c := 4e-4, 1e-4
	want := (a*d[0]*d[0]+a*d[1]*d[1]-2*c*d[0]*d[1])/(a*a-c*c) + d[2]*d[2]/a + d[3]*d[3]/9e-4 + d[4]*d[4]/a
	ln, chi2 := m.compare(expected)
	near(t, "χ²", chi2, want, 1e-12) // rounding
	near(t, "ln of the likelihood", ln, -2.5*math.Log(2*math.Pi)-math.Log((a*a-c*c)*a*a*9e-4)/2-want/2, 1e-12)

	// A part of the profile takes its part of the covariance.
	part := p.slice(1, 4)
	if len(part.Covariance) != 9 || part.Covariance[0] != 4e-4 || part.Covariance[8] != 9e-4 || part.Covariance[1] != 0 {
		t.Errorf("covariance of bins 2 to 4: %v", part.Covariance)
	}
}

// TestTwoSidedErrors chooses the side by the model.
func TestTwoSidedErrors(t *testing.T) {
	for _, added := range [][]float64{nil, {0}} {
		m := newMeasure(&Profile{Bins: []Bin{{Shear: 0.1, Minus: 0.01, Plus: 0.04}}}, added)
		_, above := m.compare([]float64{0.14})
		_, below := m.compare([]float64{0.09})
		near(t, "model above", above, 1, 1e-12) // rounding
		near(t, "model below", below, 1, 1e-12)
		// The likelihood is a density of the model's shear: it integrates to one.
		sum := 0.0
		const step = 1e-4
		for g := -0.2; g < 0.5; g += step {
			ln, _ := m.compare([]float64{g})
			sum += math.Exp(ln) * step
		}
		near(t, "norm", sum, 1, 1e-4) // the step at the datum
	}
}

func TestBadProfiles(t *testing.T) {
	five := func(name string, x ...float64) catalogue.Column { return column(name, "", x...) }
	good := five("error", 0.02, 0.02, 0.02, 0.02, 0.02)
	spoil := func(name string, row int, x float64) func(*estimate.Task) {
		return func(k *estimate.Task) { k.Tables["profile"].Values(name)[row-1] = x }
	}
	for _, x := range []struct {
		name  string
		with  catalogue.Column
		spoil func(*estimate.Task)
		says  []string
	}{
		{"negative error", good, spoil("error", 3, -0.02), []string{"shear.csv, row 3", "error below, -0.02"}},
		{"bounds about nothing", five("low", 0.1, 0.1, 0.2, 0, 0), func(k *estimate.Task) {
			p := k.Tables["profile"]
			p.Columns = append(p.Columns, five("high", 0.3, 0.3, 0.3, 0.1, 0.1))
		}, []string{"shear.csv, row 3", "`low` = 0.2"}},
		{"bins for a profile", good, func(k *estimate.Task) { k.Blocks["bins"] = logBins(1, 2, 3) }, []string{"bins"}},
		{"error of zero", good, spoil("error", 5, 0), []string{"shear.csv, row 5"}},
		{"no errors", five("cross", 0, 0, 0, 0, 0), func(*estimate.Task) {}, []string{"shear.csv", "no errors"}},
		{"shear above 1", good, spoil("value", 1, 1.4), []string{"shear.csv, row 1", "above 1"}},
		{"unsorted", good, func(k *estimate.Task) { spoil("inner", 3, 50)(k); spoil("outer", 3, 60)(k) }, []string{"shear.csv, row 3", "sort"}},
		{"overlapping", good, spoil("inner", 3, 390), []string{"shear.csv, row 3", "390", "400", "overlap"}},
		{"inside out", good, spoil("outer", 2, 150), []string{"shear.csv, row 2", "outer"}},
		{"below zero", good, spoil("inner", 1, -3), []string{"shear.csv, row 1", "below zero"}},
		{"source in front", good, func(k *estimate.Task) { k.Blocks["profile"]["source_redshift"] = method.Exactly(0.2) }, []string{"redshift 0.2 lie in front of the lens at redshift 0.25"}},
		{"source at the lens", good, func(k *estimate.Task) { k.Blocks["profile"]["source_redshift"] = method.Exactly(0.25) }, []string{"in front"}},
		{"no source", good, func(k *estimate.Task) { delete(k.Blocks["profile"], "source_redshift") }, []string{"source_redshift"}},
		{"two sources", good, func(k *estimate.Task) {
			k.Tables["profile.sources"] = table("nz.csv", column("redshift", "", 1))
		}, []string{"twice"}},
		{"sources in front", good, func(k *estimate.Task) {
			delete(k.Blocks["profile"], "source_redshift")
			k.Tables["profile.sources"] = table("nz.csv", column("redshift", "", 0.1, 0.2))
		}, []string{"nz.csv", "in front"}},
		{"sources of no weight", good, func(k *estimate.Task) {
			delete(k.Blocks["profile"], "source_redshift")
			k.Tables["profile.sources"] = table("nz.csv", column("redshift", "", 0.1, 2), column("weight", "", 0, 0))
		}, []string{"nz.csv", "weight is zero"}},
		{"sources of negative weight", good, func(k *estimate.Task) {
			delete(k.Blocks["profile"], "source_redshift")
			k.Tables["profile.sources"] = table("nz.csv", column("redshift", "", 0.1, 2), column("weight", "", 1, -1))
		}, []string{"nz.csv, row 2", "below zero"}},
		{"source of negative redshift", good, func(k *estimate.Task) {
			delete(k.Blocks["profile"], "source_redshift")
			k.Tables["profile.sources"] = table("nz.csv", column("redshift", "", -1, 2))
		}, []string{"nz.csv, row 1", "-1"}},
		{"covariance of a sixth bin", good, func(k *estimate.Task) {
			k.Tables["profile.covariance"] = table("cov.csv", column("first", "", 1, 6), column("second", "", 1, 6), column("value", "", 1, 1))
		}, []string{"cov.csv, row 2", "1 to 5"}},
		{"covariance of half a bin", good, func(k *estimate.Task) {
			k.Tables["profile.covariance"] = table("cov.csv", column("first", "", 1.5), column("second", "", 1), column("value", "", 1))
		}, []string{"cov.csv, row 1"}},
		{"covariance that contradicts itself", good, func(k *estimate.Task) {
			k.Tables["profile.covariance"] = table("cov.csv", column("first", "", 1, 2), column("second", "", 2, 1), column("value", "", 1, 2))
		}, []string{"cov.csv, row 2", "earlier row"}},
		{"covariance not positive definite", good, func(k *estimate.Task) {
			k.Tables["profile.covariance"] = table("cov.csv", column("first", "", 1, 2, 3, 4, 5, 1), column("second", "", 1, 2, 3, 4, 5, 2), column("value", "", 1, 1, 1, 1, 1, 3))
		}, []string{"cov.csv", "positive definite", "eigenvalue is -2"}},
	} {
		task := profileTask(t, catalogue.Column{Name: x.with.Name, Values: append([]float64(nil), x.with.Values...)})
		x.spoil(task)
		_, err := profileReduction.Run(context.Background(), task)
		refused(t, x.name, err, append(x.says, "lensing.shear: ")...)
	}
	for _, x := range []struct {
		name   string
		radius []float64
		says   string
	}{
		{"two bins", []float64{100, 200}, "2 bins; at least 3"},
		{"unsorted radii", []float64{100, 300, 200}, "row 3"},
		{"equal radii", []float64{100, 100, 200}, "row 2"},
		{"radius of zero", []float64{0, 100, 200}, "row 1"},
	} {
		task := profileTask(t)
		n := len(x.radius)
		task.Tables["profile"] = table("shear.csv", column("radius", "kpc", x.radius...), column("value", "", make([]float64, n)...), column("error", "", ones(n)...))
		_, err := profileReduction.Run(context.Background(), task)
		refused(t, x.name, err, "shear.csv", x.says)
	}
}
