package recipes

import (
	"fmt"
	"math"

	"github.com/hashicorp/hcl/v2"

	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// overdensity reads 500, overdensity(500), overdensity(200, "mean") or
// overdensity("virial").
func (l *loader) overdensity(t term, s method.Setting, v *method.Value) bool {
	if t.kind != callTerm {
		t = term{kind: callTerm, at: t.at, name: "overdensity", items: []term{t}}
	}
	if !t.is("overdensity") {
		l.notAnOverdensity(t, s.Name)
		return false
	}
	delta, of, ok := l.overdensityCall(t)
	v.Prior, v.Text = prior.Exact(delta), of
	return ok
}

func (l *loader) notAnOverdensity(t term, name string) {
	l.add(problem{at: t.at, what: fmt.Sprintf("%s is an overdensity, not %s", name, t.describe()), write: "Write 500, overdensity(200, \"mean\") or overdensity(\"virial\")."})
}

// overdensityCall reads the arguments of overdensity(…); delta is 0 for the
// virial one.
func (l *loader) overdensityCall(t term) (delta float64, of string, ok bool) {
	if !l.count(t, []string{"delta", "\"mean\""}, 1) {
		return 0, "", false
	}
	first := t.items[0]
	if first.kind == textTerm && first.text == "virial" {
		if len(t.items) > 1 {
			l.add(problem{at: t.items[1].at, what: "the virial overdensity takes nothing beside it", write: "Write overdensity(\"virial\")."})
			return 0, "", false
		}
		return 0, "virial", l.virialAllowed(t.at)
	}
	if first.kind == badTerm {
		return 0, "", false
	}
	if first.kind != numberTerm {
		l.add(problem{at: first.at, what: fmt.Sprintf("an overdensity is a number, not %s", first.describe()), write: "Write 500, overdensity(200, \"mean\") or overdensity(\"virial\")."})
		return 0, "", false
	}
	delta = float(first.number)
	if !(delta >= 1 && delta <= 1e6) {
		l.add(problem{at: first.at, what: "an overdensity lies between 1 and 1e6", why: "It is the mean density inside the radius over the critical density, or over the mean matter density."})
		return 0, "", false
	}
	if len(t.items) == 1 {
		return delta, "critical", true
	}
	of, ok = l.oneOf(t.items[1], "a density to measure by", []string{"critical", "mean"}, nil)
	return delta, of, ok
}

// virialAllowed checks that the background is one for which the virial
// overdensity is known.
func (l *loader) virialAllowed(at hcl.Range) bool {
	c := l.background
	if c == nil { // unreadable: reported where it stands
		return true
	}
	tolerance := 1e-12
	if c.CMBTemperature > 0 {
		tolerance = 1e-3 // the density of radiation, which is not computed here
	}
	flat := c.Flat || math.Abs(1-c.OmegaMatter-c.OmegaLambda) < tolerance
	if !flat || c.W0 != -1 || c.Wa != 0 {
		l.add(problem{at: at, what: "the virial overdensity is not known in this cosmology",
			why: "The formula of Bryan & Norman (1998) holds in a flat background with a cosmological constant only.", write: "Write the overdensity as a number."})
		return false
	}
	return true
}
