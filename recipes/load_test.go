package recipes

import (
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
	"github.com/hashicorp/hcl/v2"

	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// load reads a recipe that must be right.
func load(t *testing.T, file string, reported ...method.Setting) *Recipe {
	t.Helper()
	r, ds := Load(file, testProbes, reported)
	if r == nil {
		var b strings.Builder
		ds.Text(&b)
		t.Fatalf("%s", b.String())
	}
	return r
}

// write puts files into a new folder and returns the path of the first, which
// is "recipe.hcl".
func write(t *testing.T, recipe string, files ...string) string {
	t.Helper()
	folder := t.TempDir()
	for i := 0; i < len(files); i += 2 {
		file := filepath.Join(folder, files[i])
		if err := os.MkdirAll(filepath.Dir(file), 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(file, []byte(files[i+1]), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	file := filepath.Join(folder, "recipe.hcl")
	if err := os.WriteFile(file, []byte(recipe), 0o644); err != nil {
		t.Fatal(err)
	}
	return file
}

// says reads a recipe that must be wrong and returns what is said.
func says(t *testing.T, file string) string {
	t.Helper()
	r, ds := Load(file, testProbes, nil)
	if r != nil || !ds.HasErrors() {
		t.Errorf("%s was read", file)
	}
	var b strings.Builder
	if err := ds.Text(&b); err != nil {
		t.Error(err)
	}
	return b.String()
}

const head = `
object "Curlew" { redshift = 0.212 }
cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3
}
`

const scaling = `
dynamics "sigma" {
  dispersion { value = "970 +- 30 km/s" }
  estimate "scaling" { method = "dispersion-scaling" }
}
`

func TestWhole(t *testing.T) {
	r := load(t, "testdata/whole/recipe.hcl")
	if want := []string{"testdata/whole/recipe.hcl", "testdata/whole/survey.hcl"}; r.File != want[0] || !slices.Equal(r.Files, want) {
		t.Errorf("files %q, %q", r.File, r.Files)
	}
	// 14h01m02.1s is 210.25875°, +02°52′42″ is 2.878333…°.
	ra, dec := 210.25875*math.Pi/180, (2+52/60.+42/3600.)*math.Pi/180
	if o := r.Object; o.Name != "Curlew" || o.Redshift != 0.212 || !o.HasCentre || math.Abs(o.RA-ra) > 1e-15 || math.Abs(o.Dec-dec) > 1e-16 {
		t.Errorf("object %+v, centre %.17g %.17g", o, ra, dec)
	}
	if c := r.Cosmology; c.HubbleConstant != 70 || c.OmegaMatter != 0.3 || c.OmegaLambda != 0.7 || !c.Flat || c.W0 != -1 || c.Wa != 0 || c.CMBTemperature != 0 {
		t.Errorf("cosmology %+v", c)
	}
	if s := r.Sampling; s.Draws != 4000 || s.Seed != 7 {
		t.Errorf("sampling %+v", s)
	}
	var nuisances []string
	for _, n := range r.Nuisances {
		nuisances = append(nuisances, n.Name+" "+n.Prior.String())
	}
	if want := []string{"temperature_scale normal(1, 0.04)", "elongation lognormal(1, 0.1)", "unused_here uniform(0, 1)"}; !slices.Equal(nuisances, want) {
		t.Errorf("nuisances %q, want %q: the recipe's replaces the included one", nuisances, want)
	}

	var names []string
	for _, b := range r.Blocks {
		for _, e := range b.Estimates {
			names = append(names, b.Probe+"."+b.Name+"."+e.Name+" "+e.Method)
		}
	}
	if want := []string{"xray.spectra.backward backward", "lensing.shapes.nfw tangential-shear", "lensing.arc.ring ring", "dynamics.redshifts.sigma dispersion-scaling"}; !slices.Equal(names, want) {
		t.Errorf("estimates %q", names)
	}

	backward := r.Blocks[0].Estimates[0].Settings
	if v := backward["temperature_scale"]; v.Nuisance != "temperature_scale" || v.Prior.String() != "normal(1, 0.04)" {
		t.Errorf("a block's assumption: %+v", v)
	}
	if v := backward["temperature_scatter"]; v.Prior.String() != "half_normal(0.05)" {
		t.Errorf("a default: %+v", v)
	}
	if _, given := backward["fit_within"]; given {
		t.Error("a setting that is neither given nor has a default has a value")
	}
	shear := r.Blocks[1]
	if got := shear.Estimates[0].Settings["covariance"].List; !slices.Equal(got, []string{"shape"}) {
		t.Errorf("covariance %q", got)
	}
	d := shear.Data[0]
	if d.Kind != "galaxies" || d.File != "shapes.fits" || d.Path != "testdata/whole/shapes.fits" || d.Select == nil || d.Select.Text() != "zphot > 0.4 && flag == 0" {
		t.Errorf("galaxies %+v", d)
	}
	want := []Column{{Role: "ra", Name: "ra"}, {Role: "dec", Name: "dec"}, {Role: "e1", Name: "e1"}, {Role: "e2", Name: "e2"}, {Role: "weight", Name: "w"}, {Role: "redshift", Name: "zphot"}}
	if diff := cmp.Diff(want, d.Columns, cmpopts.IgnoreFields(Column{}, "Range")); diff != "" {
		t.Error(diff)
	}
	bins := shear.Data[1].Settings
	if bins["from"].Prior != prior.Exact(200) || bins["from"].Unit != "kpc" || bins["count"].Prior != prior.Exact(10) {
		t.Errorf("bins %+v", bins)
	}
	if got := r.Blocks[0].Data[0].Columns[2]; got.Unit != "cm**-3" {
		t.Errorf("cm-3 was read as %q", got.Unit)
	}
	// An angle for a length stays one: 18.4 arcsec.
	ring := r.Blocks[2].Estimates[0].Settings["radius"]
	if p := ring.Prior; ring.Unit != "rad" || p.Kind != prior.NormalKind || math.Abs(p.A/(18.4*math.Pi/648000)-1) > 1e-15 || math.Abs(p.B/(0.6*math.Pi/648000)-1) > 1e-15 {
		t.Errorf("Einstein radius %+v", ring)
	}
	m := r.Reported[0]
	if m.Name != "earlier_shear" || m.Probe != "lensing" || m.Via != "shear" || m.Settings["mass"].Prior != (prior.Prior{Kind: prior.TwoPieceKind, A: 6.1e14, B: 0.8e14, C: 0.9e14}) {
		t.Errorf("reported %+v", m)
	}
	if c := m.Cosmology; c == nil || c.HubbleConstant != 73 || c.OmegaLambda != 0.73 {
		t.Errorf("the reported mass's cosmology %+v", c)
	}
	if v := m.Settings["overdensity"]; v.Prior != prior.Exact(500) || v.Text != "critical" {
		t.Errorf("overdensity %+v", v)
	}
	wantReconcile := &Reconcile{
		Estimates: []string{"xray.spectra.backward", "lensing.shapes.nfw", "dynamics.redshifts.sigma"},
		At: []At{
			{Delta: 2500, Of: "critical", Text: "overdensity 2500"},
			{Delta: 500, Of: "critical", Text: "overdensity 500"},
			{Radius: 1000, Unit: "kpc", Text: "radius 1 Mpc"},
		},
		RadiiFrom: "lensing.shapes.nfw", Limits: []float64{2, 3, 5}, Combined: "linear",
	}
	if diff := cmp.Diff(wantReconcile, r.Reconcile, cmpopts.IgnoreTypes(hcl.Range{})); diff != "" {
		t.Error(diff)
	}
}

// Two hundred readings say the same.
func TestDeterministic(t *testing.T) {
	for _, file := range []string{"testdata/mistakes/settings.hcl", "testdata/mistakes/data.hcl", "testdata/mistakes/references.hcl", "testdata/mistakes/include_cycle.hcl", "testdata/mistakes/syntax.hcl"} {
		first := says(t, file)
		for range 200 {
			if again := says(t, file); again != first {
				t.Fatalf("%s: two answers:\n%s", file, cmp.Diff(first, again))
			}
		}
	}
}

// Values of every kind of setting, as written and as read.
func TestValues(t *testing.T) {
	exact := func(x float64, unit string) method.Value {
		return method.Value{Set: true, Prior: prior.Exact(x), Unit: unit}
	}
	drawn := func(p prior.Prior, err error) method.Value { return method.Value{Set: true, Prior: p} }
	in := func(v method.Value, unit string) method.Value { v.Unit = unit; return v }
	arcmin := math.Pi / 10800
	for _, c := range []struct {
		kind    method.Kind
		unit    string
		length  bool
		written string
		want    method.Value
	}{
		{method.Number, "", false, `0.01`, exact(0.01, "")},
		{method.Number, "", false, `"0.01"`, exact(0.01, "")},
		{method.Number, "", false, `"12 %"`, exact(0.12, "")},
		{method.Number, "", false, `-0`, exact(0, "")},
		{method.Number, "", false, `0 * -1`, exact(0, "")},
		{method.Number, "", false, `0.1 * 3`, exact(0.3, "")}, // decimals: binary fractions give 0.30000000000000004
		{method.Number, "", false, `-(1 / 0.1) / 0.1`, exact(-100, "")},
		{method.Number, "", false, `1e400 / 1e399`, method.Value{}},
		{method.Number, "", false, `1e200 * 1e200`, method.Value{}},
		{method.Number, "", false, `0.30 +- 0.02`, method.Value{}}, // not 0.28
		{method.Number, "", false, `0.30 + 0.02 - 0.03`, method.Value{}},
		{method.Number, "", false, `0.30 ± 0.02`, method.Value{}},
		{method.Number, "", false, `1.5e3`, exact(1500, "")},
		{method.Number, "", false, `normal(0.0, 0.02)`, drawn(prior.Normal(0, 0.02))},
		{method.Number, "", false, `half_normal(0.1)`, drawn(prior.HalfNormal(0.1))},
		{method.Number, "", false, `lognormal(4.5, 0.3)`, drawn(prior.LogNormal(4.5, 0.3))},
		{method.Number, "", false, `uniform(-0.5, 0.5)`, drawn(prior.Uniform(-0.5, 0.5))},
		{method.Number, "", false, `loguniform(1, 20)`, drawn(prior.LogUniform(1, 20))},
		{method.Number, "", false, `"0.30 +- 0.02"`, drawn(prior.Normal(0.3, 0.02))},
		{method.Number, "", false, `"0.30 +0.02 -0.03"`, drawn(prior.TwoPiece(0.3, 0.03, 0.02))},
		{method.Number, "", false, `"0.30 +0.02 -0.02"`, drawn(prior.Normal(0.3, 0.02))},
		{method.Number, "", false, `nuisance.given`, method.Value{Set: true, Prior: prior.Prior{Kind: prior.NormalKind, A: 1, B: 0.1}, Nuisance: "given"}},
		{method.Number, "", false, `object.redshift`, exact(0.212, "")},
		{method.Number, "", false, `relation("duffy-2008")`, method.Value{Set: true, Relation: "duffy-2008"}},
		{method.Number, "rad", false, `normal("62 deg", "3 deg")`, in(drawn(prior.Normal(62*math.Pi/180, 3*math.Pi/180)), "rad")},
		{method.Number, "rad", false, `nuisance.tilt`, method.Value{Set: true, Prior: prior.Prior{Kind: prior.NormalKind, A: 62 * math.Pi / 180, B: 3 * math.Pi / 180}, Nuisance: "tilt", Unit: "rad"}},
		{method.Number, "kpc", true, `nuisance.tilt`, method.Value{Set: true, Prior: prior.Prior{Kind: prior.NormalKind, A: 62 * math.Pi / 180, B: 3 * math.Pi / 180}, Nuisance: "tilt", Unit: "rad"}},
		{method.Number, "solMass", false, `lognormal("5e14 Msun", 0.2)`, in(drawn(prior.LogNormal(5e14, 0.2)), "solMass")},
		{method.Number, "kpc", true, `"1.001 Mpc"`, exact(1001, "kpc")},
		{method.Number, "kpc", true, `"3 arcmin"`, exact(3*arcmin, "rad")},
		{method.Number, "kpc", true, `0`, exact(0, "kpc")},
		{method.Number, "kpc", true, `uniform(0, "3 arcmin")`, in(drawn(prior.Uniform(0, 3*arcmin)), "rad")},
		{method.Number, "kpc", true, `half_normal("0.1 Mpc")`, in(drawn(prior.HalfNormal(100)), "kpc")},
		{method.Exact, "keV", false, `"5000 eV"`, exact(5, "keV")},
		{method.Measured, "km/s", false, `"970 +- 30 km/s"`, in(drawn(prior.Normal(970, 30)), "km/s")},
		{method.Measured, "km/s", false, `normal("970 km/s", "30 km/s")`, in(drawn(prior.Normal(970, 30)), "km/s")},
		{method.Measured, "km/s", false, `"970 km/s"`, exact(970, "km/s")},
		{method.Integer, "", false, `12`, exact(12, "")},
		{method.Integer, "", false, `12.0`, exact(12, "")},
		{method.Integer, "", false, `12.5`, method.Value{}},
		{method.Integer, "", false, `9007199254740993`, method.Value{}}, // 2⁵³ + 1
		{method.Choice, "", false, `"b"`, method.Value{Set: true, Text: "b"}},
		{method.Choices, "", false, `["b", "a"]`, method.Value{Set: true, List: []string{"b", "a"}}},
		{method.Choices, "", false, `[]`, method.Value{}},
		{method.Span, "kpc", true, `["0.3 Mpc", "3 Mpc"]`, method.Value{Set: true, Numbers: []float64{300, 3000}, Unit: "kpc"}},
		{method.Span, "kpc", true, `[0, "3 arcmin"]`, method.Value{Set: true, Numbers: []float64{0, 3 * arcmin}, Unit: "rad"}},
		{method.Span, "kpc", true, `["1 arcmin", "3 Mpc"]`, method.Value{}},
		{method.Span, "kpc", true, `["1 Mpc"]`, method.Value{}},
		{method.List, "kpc", true, `["100 kpc", "0.2 Mpc", "1 Mpc"]`, method.Value{Set: true, Numbers: []float64{100, 200, 1000}, Unit: "kpc"}},
		{method.List, "kpc", true, `["100 kpc", "100 kpc"]`, method.Value{}},
		{method.Flag, "", false, `false`, method.Value{Set: true}},
		{method.Flag, "", false, `true`, method.Value{Set: true, Flag: true}},
		{method.Text, "", false, `"as it stands"`, method.Value{Set: true, Text: "as it stands"}},
		{method.Overdensity, "", false, `500`, method.Value{Set: true, Prior: prior.Exact(500), Text: "critical"}},
		{method.Overdensity, "", false, `overdensity(200, "mean")`, method.Value{Set: true, Prior: prior.Exact(200), Text: "mean"}},
		{method.Overdensity, "", false, `overdensity("virial")`, method.Value{Set: true, Text: "virial"}},
		{method.Overdensity, "", false, `"500"`, method.Value{}},
		{method.Overdensity, "", false, `0.5`, method.Value{}},
	} {
		s := method.Setting{Name: "x", Kind: c.kind, Unit: c.unit, Length: c.length, Choices: []string{"a", "b"}, Relation: []string{"duffy-2008"}}
		probe := method.Probe{Name: "test", Methods: []method.Declaration{{Name: "m", Settings: []method.Setting{s}}}}
		file := write(t, head+`
nuisance "given" { prior = normal(1, 0.1) }
nuisance "tilt" { prior = normal("62 deg", "3 deg") }
test "a" {
  estimate "b" {
    method = "m"
    x      = `+c.written+`
  }
}
`)
		r, ds := Load(file, []method.Probe{probe}, nil)
		if !c.want.Set {
			if r != nil || len(ds) == 0 || ds[len(ds)-1].Line != 13 {
				t.Errorf("%s was read: %v", c.written, ds)
			}
			continue
		}
		if r == nil {
			t.Errorf("%s: %+v", c.written, ds)
			continue
		}
		got := r.Blocks[0].Estimates[0].Settings["x"]
		// One unit in the last place for π, which Go's constant rounds.
		if diff := cmp.Diff(c.want, got, cmpopts.EquateApprox(2e-16, 0)); diff != "" {
			t.Errorf("%s:\n%s", c.written, diff)
		}
	}
}

// Respelling a unit, the order and the comments changes nothing that a key is
// made of.
func TestSpellingChangesNoTranscript(t *testing.T) {
	transcript := func(text string) []string {
		r := load(t, write(t, head+text))
		var lines []string
		for _, b := range r.Blocks {
			for _, d := range b.Data {
				lines = append(lines, d.Settings.Transcript()...)
			}
			for _, e := range b.Estimates {
				lines = append(lines, e.Settings.Transcript()...)
			}
		}
		return lines
	}
	first := transcript(`dynamics "a" {
  dispersion {
    value  = "970 +- 30 km/s"
    within = "1.001 Mpc"
  }
  velocity_bias = normal(1.0, 0.1)
  estimate "s" { method = "dispersion-scaling" }
}`)
	second := transcript(`dynamics "a" {
  estimate "s" {
    velocity_bias = "1 +- 0.1"   # the same prior
    scaling       = "munari-2013"
    method        = "dispersion-scaling"
    overdensity   = overdensity(200)
  }
  dispersion {
    within = "1001 kpc"
    value  = normal("970 km s-1", "0.03 Mm/s")
  }
}`)
	if diff := cmp.Diff(first, second); diff != "" || len(first) == 0 {
		t.Error(diff)
	}
}

func TestIncludes(t *testing.T) {
	// Paths are relative to the file that names them; the nearer declaration
	// replaces the farther one; a file reached on two ways is read once.
	file := write(t, `include = ["shared/a.hcl", "shared/b.hcl"]
object "Curlew" {
  redshift = 0.212
  centre   = sky(210.25, 2.87)
}`,
		"shared/a.hcl", `include = ["deep/common.hcl"]
nuisance "x" { prior = normal(1, 1) }
dynamics "redshifts" {
  galaxies {
    file     = "../data/redshifts.csv"
    ra       = column("ra", "deg")
    dec      = column("dec", "deg")
    redshift = column("z")
  }
  members { method = "given" }
  estimate "s" {
    method        = "dispersion-scaling"
    velocity_bias = nuisance.x
  }
}`,
		"shared/b.hcl", `include = ["deep/common.hcl"]`,
		"shared/deep/common.hcl", `cosmology {
  hubble_constant = "70 km/s/Mpc"
  omega_matter    = 0.3
}
nuisance "x" { prior = normal(1, 2) }`,
		"data/redshifts.csv", "ra,dec,z\n")
	r, ds := Load(file, testProbes, nil)
	// a.hcl replaces x of common.hcl, which b.hcl brings along a second way.
	if r != nil || len(ds) != 1 || !strings.Contains(ds[0].Summary, `nuisance "x" comes from two included files`) {
		t.Fatalf("%+v", ds)
	}
	text, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(file, append(text, "\nnuisance \"x\" { prior = normal(1, 3) }\n"...), 0o644); err != nil {
		t.Fatal(err)
	}
	r = load(t, file)
	if len(r.Nuisances) != 1 || r.Nuisances[0].Prior.B != 3 || r.Blocks[0].Estimates[0].Settings["velocity_bias"].Prior.B != 3 {
		t.Errorf("nuisances %+v", r.Nuisances)
	}
	folder := filepath.Dir(file)
	if got, want := r.Blocks[0].Data[0].Path, filepath.Join(folder, "data/redshifts.csv"); got != want {
		t.Errorf("path %s, want %s", got, want)
	}
	var files []string
	for _, f := range r.Files {
		name, err := filepath.Rel(folder, f)
		if err != nil {
			t.Fatal(err)
		}
		files = append(files, filepath.ToSlash(name))
	}
	if want := []string{"recipe.hcl", "shared/a.hcl", "shared/deep/common.hcl", "shared/b.hcl"}; !slices.Equal(files, want) {
		t.Errorf("files %q, want %q", files, want)
	}
}

// Attributes that the reported package declares are read like those of the
// language, and take their place.
func TestReportedSettings(t *testing.T) {
	r := load(t, write(t, head+`
reported "a" {
  probe       = "dynamics"
  via         = "caustic"
  mass        = "5 +- 1 10**14 solMass"
  radius      = "5 arcmin"
  projected   = true
  calibration = "hydrostatic"
}
reported "b" {
  probe       = "sz"
  mass        = "5 +- 1 10**14 solMass"
  overdensity = overdensity("virial")
}
`), method.Setting{Name: "calibration", Kind: method.Choice, Choices: []string{"hydrostatic"}},
		method.Setting{Name: "concentration", Kind: method.Number, Default: method.Exactly(5)})
	a, b := r.Reported[0], r.Reported[1]
	if a.Via != "caustic" || a.Settings["calibration"].Text != "hydrostatic" || a.Settings["radius"].Unit != "rad" || !a.Settings["projected"].Flag || a.Cosmology != nil {
		t.Errorf("%+v", a)
	}
	if b.Via != "gas-mass" || b.Settings["via"].Text != "gas-mass" || b.Settings["overdensity"].Text != "virial" || b.Settings["concentration"].Prior != prior.Exact(5) {
		t.Errorf("%+v", b)
	}
}

// The virial overdensity is refused where its formula does not hold: in the
// background that it is meant in, be that the recipe's or the reported one.
func TestVirial(t *testing.T) {
	const flat, open = "omega_matter = 0.3", "omega_matter = 0.3\n  omega_lambda = 0.6"
	recipe := func(own, quoted string) string {
		return "object \"Curlew\" { redshift = 0.212 }\ncosmology {\n  hubble_constant = \"70 km/s/Mpc\"\n  " + own + "\n}\n" +
			"reported \"a\" {\n  probe = \"xray\"\n  mass = \"5 +- 1 10**14 solMass\"\n  overdensity = overdensity(\"virial\")\n" +
			"  cosmology {\n    hubble_constant = \"70 km/s/Mpc\"\n    " + quoted + "\n  }\n}\n"
	}
	for _, c := range []struct {
		own, quoted string
		allowed     bool
	}{{flat, flat, true}, {open, flat, true}, {flat, open, false}, {flat, "omega_matter = 0.3\n w0 = -0.9", false}, {flat, "omega_matter = 0.3\n omega_lambda = 0.7", true}} {
		r, ds := Load(write(t, recipe(c.own, c.quoted)), testProbes, nil)
		if (r != nil) != c.allowed {
			t.Errorf("%q quoted in %q: %+v", c.own, c.quoted, ds)
		}
	}
}

// Files that are no recipes, and recipes that are not there.
func TestUnreadable(t *testing.T) {
	folder := t.TempDir()
	file := filepath.Join(folder, "curlew.hcl")
	if err := os.WriteFile(file, make([]byte, maxRecipeBytes+1), 0o644); err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct{ file, says string }{
		{filepath.Join(folder, "curlw.hcl"), "Did you mean"},
		{filepath.Join(folder, "no", "curlew.hcl"), "There is no folder"},
		{folder, "is a folder"},
		{file, "too large"},
		{"/dev/zero", "not a plain file"},
		{"", "does not exist"},
	} {
		if got := says(t, c.file); !strings.Contains(got, c.says) {
			t.Errorf("%q: %s", c.file, got)
		}
	}
}

// Input made to exhaust a parser ends with an error.
func TestHostileInput(t *testing.T) {
	const n = 20000
	for _, unit := range []string{"(", "[", "{", "-", "!", "1+", "1?1:", "a.", "a[", "f(", "\"${", "b {\n", "x = 1 ", "'", "\"", "<<A\n", "%{if ", "[for x in ", "a = 1\n", "b \"x\" {}\n", "/*", "\\", "é"} {
		for _, lead := range []string{"", "x = ", "object \"a\" {\n redshift = "} {
			says(t, write(t, lead+strings.Repeat(unit, n/len(unit))))
		}
	}
	// The same inside a condition, whose text is parsed a second time.
	for _, unit := range []string{"(", "-", "!", "a+", "a&&", "a[", "f("} {
		if _, ds := compileSelect(strings.Repeat(unit, n/len(unit)) + "a"); !ds.HasErrors() {
			t.Errorf("a condition of %d times %s was compiled", n/len(unit), unit)
		}
	}
}

// A name is written in the file's own bytes: an accent may be one character or
// two, and the file system tells them apart.
func TestFileNamesAreNotNormalised(t *testing.T) {
	const name = "re\u0301gions.csv" // decomposed
	r := load(t, write(t, head+`
xray "a" {
  density {
    file   = "`+name+`"
    inner  = column("r")
    outer  = column("R")
    value  = column("n")
    error  = column("e")
  }
  estimate "g" { method = "gas-only" }
}`, name, ""))
	if got := r.Blocks[0].Data[0].File; got != name {
		t.Errorf("file %+q, want %+q", got, name)
	}
}

func BenchmarkLoad(b *testing.B) {
	for b.Loop() {
		if r, ds := Load("testdata/whole/recipe.hcl", testProbes, nil); r == nil {
			b.Fatal(ds)
		}
	}
}
