package recipes

import (
	"fmt"
	"slices"

	"github.com/hashicorp/hcl/v2/hclsyntax"

	"steelyard/probes/method"
)

// wordsOfReported are the attributes that the language itself gives a reported
// mass.
var wordsOfReported = []method.Setting{
	{Name: "probe", Kind: method.Choice, Required: true, Choices: []string{"xray", "lensing", "dynamics", "sz"},
		Doc: "What the mass was measured by: it says how the mass moves when the cosmology does."},
	{Name: "via", Kind: method.Choice, Choices: []string{"hydrostatic", "jeans", "virial", "caustic", "shear", "strong-lensing", "dispersion-scaling", "gas-mass"},
		Doc: "How the mass was made."},
	{Name: "mass", Kind: method.Measured, Unit: "solMass", Required: true, Low: 1, High: 1e18, Doc: "The published mass with its error."},
	{Name: "overdensity", Kind: method.Overdensity, Doc: "The overdensity within whose radius the mass was quoted."},
	{Name: "radius", Kind: method.Exact, Unit: "kpc", Length: true, Low: 1e-6, High: 1e6, Doc: "The radius within which the mass was quoted."},
	{Name: "projected", Kind: method.Flag, Default: method.Value{Set: true}, Doc: "Whether the mass is that in a cylinder along the line of sight."},
	{Name: "concentration", Kind: method.Number, Low: 0.1, High: 100, Relation: []string{"duffy-2008"}, Default: method.Related("duffy-2008"),
		Doc: "Concentration c_200c of the halo along which the mass is carried to other radii."},
	{Name: "source_redshift", Kind: method.Exact, Low: 1e-6, High: 1100, Doc: "Redshift of the lensed sources."},
	{Name: "source", Kind: method.Text, Doc: "Where the mass was published."},
}

// viaOf is how a mass of each probe was made when nothing is said.
var viaOf = map[string]string{"xray": "hydrostatic", "lensing": "shear", "dynamics": "virial", "sz": "gas-mass"}

// reportedSettings merges declared attributes into those of the language; a
// declared one of the same name takes its place.
func reportedSettings(declared []method.Setting) []method.Setting {
	all := slices.Clone(wordsOfReported)
	for _, s := range declared {
		i := slices.IndexFunc(all, func(known method.Setting) bool { return known.Name == s.Name })
		if i < 0 {
			all = append(all, s)
			continue
		}
		all[i] = s
	}
	return all
}

// reportedBlock reads one published mass.
func (l *loader) reportedBlock(b *hclsyntax.Block) {
	out := Reported{Name: l.name(b, "earlier"), Settings: method.Settings{}, Range: b.DefRange()}
	l.check(b.Body, vocabulary{block: "reported", settings: settingNames(l.reported), blocks: []string{"cosmology"}})
	recipes := l.background
	l.once(b.Body.Blocks, title(b))
	for _, inner := range b.Body.Blocks {
		if inner.Type != "cosmology" {
			continue
		}
		l.background = nil
		if c, ok := l.readCosmology(inner); ok {
			out.Cosmology = &c
			l.background = &c
		}
	}
	for _, s := range l.reported {
		t, given := l.attribute(b.Body, s.Name)
		if !given {
			l.byDefault(out.Settings, s, b, "reported")
			continue
		}
		if v, ok := l.value(t, s); ok {
			out.Settings[s.Name] = v
			l.behindTheLens(t, s, v)
		}
	}
	l.background = recipes

	radius, overdensity := b.Body.Attributes["radius"], b.Body.Attributes["overdensity"]
	switch {
	case !l.has(b.Body, "radius") && !l.has(b.Body, "overdensity"):
		l.add(problem{at: b.DefRange(), absence: true, what: "reported needs overdensity or radius", why: "A mass is that inside some radius.", write: "Write overdensity = 500, or radius = \"1 Mpc\"."})
	case radius != nil && overdensity != nil:
		l.add(problem{at: later(radius, overdensity).NameRange, what: "radius and overdensity cannot be given together", write: "Keep the one within which the mass was quoted."})
	}
	if a := b.Body.Attributes["projected"]; a != nil && out.Settings["projected"].Flag && radius == nil && overdensity != nil {
		l.add(problem{at: a.SrcRange, what: "a projected mass is quoted within a radius", why: "An overdensity is that of a sphere.", write: "Write radius = \"1 Mpc\" instead of the overdensity."})
	}
	out.Probe = out.Settings["probe"].Text
	if _, given := out.Settings["via"]; !given && out.Probe != "" && b.Body.Attributes["via"] == nil {
		out.Settings["via"] = method.Word(viaOf[out.Probe])
	}
	out.Via = out.Settings["via"].Text
	if a := b.Body.Attributes["source_redshift"]; a != nil && out.Via != "" && out.Via != "shear" && out.Via != "strong-lensing" {
		l.add(problem{at: a.NameRange, what: "source_redshift belongs to a mass from lensing", why: fmt.Sprintf("This one was made via %s.", out.Via), write: "Leave it out, or write via = \"shear\" or via = \"strong-lensing\"."})
	}
	l.recipe.Reported = append(l.recipe.Reported, out)
}

// later returns the attribute that stands behind the other.
func later(a, b *hclsyntax.Attribute) *hclsyntax.Attribute {
	if a.SrcRange.Start.Byte > b.SrcRange.Start.Byte {
		return a
	}
	return b
}
