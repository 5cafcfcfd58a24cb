package history

import (
	"strings"
	"testing"

	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// Every form that a setting's value takes in a key comes out in the words of a
// recipe. The key's form is asked of the package that writes it.
func TestSettingsAreReadable(t *testing.T) {
	p := func(p prior.Prior, err error) prior.Prior {
		if err != nil {
			t.Fatal(err)
		}
		return p
	}
	for want, v := range map[string]method.Value{
		"0.5":                                   method.Exactly(0.5),
		"0":                                     method.Exactly(0),
		"250 kpc":                               {Set: true, Prior: prior.Exact(250), Unit: "kpc"},
		"normal(1, 0.04)":                       {Set: true, Prior: p(prior.Normal(1, 0.04))},
		"half_normal(0.05)":                     {Set: true, Prior: p(prior.HalfNormal(0.05))},
		"lognormal(4.5, 0.3)":                   {Set: true, Prior: p(prior.LogNormal(4.5, 0.3))},
		"uniform(-0.5, 0.5)":                    {Set: true, Prior: p(prior.Uniform(-0.5, 0.5))},
		"loguniform(1e+12, 1e+16) solMass":      {Set: true, Prior: p(prior.LogUniform(1e12, 1e16)), Unit: "solMass"},
		"6.1e+14 +9e+13 -8e+13 solMass":         {Set: true, Prior: p(prior.TwoPiece(6.1e14, 8e13, 9e13)), Unit: "solMass"},
		"lognormal(1, 0.1) (nuisance.stretch)":  {Set: true, Prior: p(prior.LogNormal(1, 0.1)), Nuisance: "stretch"},
		"relation duffy-2008":                   method.Related("duffy-2008"),
		"nfw":                                   method.Word("nfw"),
		`it says "so" (here)`:                   method.Word(`it says "so" (here)`),
		"shape, structure":                      method.Words("shape", "structure"),
		"true":                                  {Set: true, Flag: true},
		"300, 3000 kpc":                         {Set: true, Numbers: []float64{300, 3000}, Unit: "kpc"},
		"500":                                   {Set: true, Prior: prior.Exact(500), Text: "critical"},
		"200 mean":                              {Set: true, Prior: prior.Exact(200), Text: "mean"},
		"virial":                                {Set: true, Text: "virial"},
		"1 arcsec":                              {Set: true, Prior: prior.Exact(4.84813681109536e-06), Unit: "rad"},
		"normal(2, 0.5) arcsec":                 {Set: true, Prior: p(prior.Normal(2*4.84813681109536e-06, 0.5*4.84813681109536e-06)), Unit: "rad"},
		"lognormal(2, 0.5) arcsec (nuisance.a)": {Set: true, Prior: p(prior.LogNormal(2*4.84813681109536e-06, 0.5)), Unit: "rad", Nuisance: "a"},
	} {
		line := method.Settings{"s": v}.Transcript()[0]
		if got := readable("s", strings.TrimPrefix(line, "s = ")); got != want {
			t.Errorf("%s reads %q, want %q", line, got, want)
		}
	}
}

func TestOtherFactsAreReadable(t *testing.T) {
	for _, c := range []struct{ name, value, want string }{
		{"cosmology", "70 0.3 0.7 -1 0 0", "H0 70 km/s/Mpc, Ωm 0.3, ΩΛ 0.7"},
		{"stated_cosmology", "73 0.27 0.729 -0.9 0.2 2.725", "H0 73 km/s/Mpc, Ωm 0.27, ΩΛ 0.729, w0 -0.9, wa 0.2, T_CMB 2.725 K"},
		{"centre", "3.6697074686276276 0.05023639363657012", "210.25875 deg, 2.87833 deg"},
		{"column.inner", `"r_in" unit "arcmin" as "kpc" length true text false`, "r_in in arcmin"},
		{"column.ra", `"ra" unit "" as "rad" length false text false`, "ra"},
		{"own", `500 "critical"`, "overdensity 500"},
		{"own (4)", `200 "mean"`, "overdensity 200 mean"},
		{"at (2)", `1000 0 ""`, "radius 1000 kpc"},
		{"at", `0 0 "virial"`, "overdensity virial"},
		{"seed", "7", "7"},
		{"select", `"z > 0.3 && flag == 0"`, "z > 0.3 && flag == 0"},
		{"a fact of the future", `what(ever "it is`, `what(ever "it is`},
	} {
		if got := readable(c.name, c.value); got != c.want {
			t.Errorf("%s: %s reads %q, want %q", c.name, c.value, got, c.want)
		}
	}
	if from, to := readablePair("projected", "exact(0, 0, 0) flag", "exact(0, 0, 0)"); from != "true" || to != "false" {
		t.Errorf("a flag that is taken away reads %s → %s", from, to)
	}
}

// What is not a key is read without harm.
func FuzzReadable(f *testing.F) {
	f.Add("cosmology", "70 0.3 0.7 -1 0 0")
	f.Add("estimate.x", `exact(1, 0, 0) list ["a" "b"]`)
	f.Add("column.x", `"a`)
	f.Fuzz(func(t *testing.T, name, value string) {
		readable(name, value)
		readablePair(name, value, "exact(0, 0, 0)")
		for _, p := range parameters("param " + value + "\n" + value) {
			if p.Value == "present" {
				t.Errorf("%q", p)
			}
		}
	})
}
