package recipes

import (
	"fmt"
	"math/big"

	"github.com/hashicorp/hcl/v2/hclsyntax"

	"steelyard/probes/method"
)

// object reads the object block.
func (l *loader) object(b *hclsyntax.Block) {
	o := &l.recipe.Object
	o.Range = b.DefRange()
	switch {
	case len(b.Labels) != 1 || b.Labels[0] == "":
		l.add(problem{at: b.TypeRange, what: "the object needs one name", write: "Write object \"Curlew\" { … }."})
	default:
		o.Name = b.Labels[0]
	}
	l.check(b.Body, vocabulary{block: "object", settings: []string{"redshift", "centre"}})
	if l.require(b.Body, b.DefRange(), "object", "redshift", "Distances and densities follow from it.", "Write redshift = 0.212.") {
		t, _ := l.attribute(b.Body, "redshift")
		if t.kind == referenceTerm && t.path[0] == "object" {
			l.add(problem{at: t.at, what: "the redshift refers to itself", write: "Write the number, like redshift = 0.212."})
		} else if s, ok := l.exactScalar(t, pure, "redshift"); ok {
			switch {
			case s.value <= 0:
				l.add(problem{at: t.at, what: "the redshift must be positive", why: "The distance is computed from it."})
			case s.value > 20:
				l.add(problem{at: t.at, what: fmt.Sprintf("%s is no redshift of an object with galaxies and gas", short(s.value)), why: "A velocity must be divided by the speed of light, 299792.458 km/s."})
			default:
				o.Redshift = s.value
			}
		}
	}
	if t, given := l.attribute(b.Body, "centre"); given {
		o.RA, o.Dec, o.HasCentre = l.sky(t)
	}
}

// cosmologySettings are the parameters of a background, all exact.
var cosmologySettings = []method.Setting{
	{Name: "hubble_constant", Kind: method.Exact, Unit: "km/s/Mpc", Low: 10, High: 500},
	{Name: "omega_matter", Kind: method.Exact, Low: 1e-3, High: 10},
	{Name: "omega_lambda", Kind: method.Exact, Low: -10, High: 10},
	{Name: "w0", Kind: method.Exact, Low: -10, High: 1},
	{Name: "wa", Kind: method.Exact, Low: -20, High: 20},
	{Name: "cmb_temperature", Kind: method.Exact, Unit: "K", Low: 0, High: 100},
}

// cosmology reads the cosmology block of the recipe.
func (l *loader) cosmology(b *hclsyntax.Block) {
	if c, ok := l.readCosmology(b); ok {
		l.recipe.Cosmology = c
		l.background = &l.recipe.Cosmology
	}
}

// readCosmology reads one cosmology block.
func (l *loader) readCosmology(b *hclsyntax.Block) (Cosmology, bool) {
	c := Cosmology{W0: -1, Range: b.DefRange()}
	l.check(b.Body, vocabulary{block: "cosmology", settings: settingNames(cosmologySettings)})
	ok := l.require(b.Body, b.DefRange(), "cosmology", "hubble_constant", "", "Write hubble_constant = \"70 km/s/Mpc\".")
	ok = l.require(b.Body, b.DefRange(), "cosmology", "omega_matter", "", "Write omega_matter = 0.3.") && ok
	into := []*float64{&c.HubbleConstant, &c.OmegaMatter, &c.OmegaLambda, &c.W0, &c.Wa, &c.CMBTemperature}
	for i, s := range cosmologySettings {
		t, given := l.attribute(b.Body, s.Name)
		if !given {
			continue
		}
		v, good := l.value(t, s)
		ok = ok && good
		*into[i] = v.Prior.A
	}
	if !l.has(b.Body, "omega_lambda") && ok {
		c.Flat = true
		c.OmegaLambda = l.oneMinus(b.Body.Attributes["omega_matter"], c.OmegaMatter)
	}
	return c, ok
}

// oneMinus returns 1 − x, exact in the decimals of the recipe: with
// omega_matter = 0.31 it is the number 0.69.
func (l *loader) oneMinus(a *hclsyntax.Attribute, x float64) float64 {
	t := l.attributeTerm(a)
	if t.kind != numberTerm {
		return 1 - x
	}
	return float(new(big.Rat).Sub(big.NewRat(1, 1), t.number))
}

// defaultSampling is what holds without a sampling block.
var defaultSampling = Sampling{Draws: 4000, Seed: 1}

var samplingSettings = []method.Setting{
	{Name: "draws", Kind: method.Integer, Low: 200, High: 1e6},
	{Name: "seed", Kind: method.Integer},
}

// sampling reads the sampling block.
func (l *loader) sampling(b *hclsyntax.Block) {
	s := &l.recipe.Sampling
	s.Range = b.DefRange()
	l.check(b.Body, vocabulary{block: "sampling", settings: settingNames(samplingSettings)})
	if t, given := l.attribute(b.Body, "draws"); given {
		if v, ok := l.value(t, samplingSettings[0]); ok {
			s.Draws = int(v.Prior.A)
		}
	}
	if t, given := l.attribute(b.Body, "seed"); given {
		if v, ok := l.value(t, samplingSettings[1]); ok {
			s.Seed = int64(v.Prior.A)
		}
	}
}

// settingNames returns the names of the settings, in order.
func settingNames(settings []method.Setting) []string {
	names := make([]string, len(settings))
	for i, s := range settings {
		names[i] = s.Name
	}
	return names
}
