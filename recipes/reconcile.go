package recipes

import (
	"fmt"
	"slices"
	"strings"

	"github.com/hashicorp/hcl/v2/hclsyntax"

	"steelyard/probes/method"
)

// reconcile reads which estimates are compared, and where.
func (l *loader) reconcile(b *hclsyntax.Block) {
	out := &Reconcile{Limits: []float64{2, 3, 5}, Combined: combinedSetting.Default.Text, Range: b.DefRange()}
	l.recipe.Reconcile = out
	l.check(b.Body, vocabulary{block: "reconcile", settings: []string{"estimates", "at", "radii_from", "limits", "preferred", combinedSetting.Name}})
	if l.require(b.Body, b.DefRange(), "reconcile", "estimates", "They are the masses to compare.", "Write estimates = [lensing.shapes.nfw, …].") {
		t, _ := l.attribute(b.Body, "estimates")
		out.Estimates = l.estimateList(t)
	}
	if l.require(b.Body, b.DefRange(), "reconcile", "at", "Masses are compared within radii.", "Write at = [overdensity(500), radius(\"1 Mpc\")].") {
		t, _ := l.attribute(b.Body, "at")
		out.At = l.radii(t)
	}
	overdensities := slices.ContainsFunc(out.At, func(a At) bool { return a.Of != "" })
	t, given := l.attribute(b.Body, "radii_from")
	switch {
	case given && t.kind == textTerm && t.text == "own":
		out.RadiiFrom = "own"
	case given && t.kind == textTerm:
		l.notAReference(t, "radii_from is a reference, or \"own\"")
	case given:
		out.RadiiFrom, _ = l.estimateName(t)
	case overdensities:
		l.add(problem{at: b.DefRange(), absence: true, what: "reconcile needs radii_from", why: "An overdensity has another radius for every estimate.",
			write: "Write radii_from = lensing.shapes.nfw, or whichever estimate's radii are to be used for all, or radii_from = \"own\" for each its own."})
	}
	if given && len(out.At) > 0 && !overdensities {
		l.add(problem{at: b.Body.Attributes["radii_from"].NameRange, warning: true, what: "radii_from is not used", why: "No overdensity is among the radii, and a fixed radius is the same for all."})
	}
	if t, given := l.attribute(b.Body, "limits"); given {
		out.Limits = l.limits(t)
	}
	if t, given := l.attribute(b.Body, "preferred"); given {
		out.Preferred = l.preferred(t, out.Estimates)
	}
	if t, given := l.attribute(b.Body, combinedSetting.Name); given {
		if v, ok := l.value(t, combinedSetting); ok {
			out.Combined = v.Text
		}
	}
}

// combinedSetting says which combined mass goes into tables.
var combinedSetting = method.Setting{Name: "combined", Kind: method.Choice, Choices: []string{"linear", "random-effects"}, Default: method.Word("linear")}

// preferred reads which of several estimates made from the same data enter the
// agreement and the combination.
func (l *loader) preferred(t term, compared []string) (names []string) {
	if t.kind == badTerm {
		return nil
	}
	if t.kind != listTerm {
		l.add(problem{at: t.at, what: "preferred is a list of references", write: "Write preferred = [dynamics.redshifts.jeans]."})
		return nil
	}
	for _, item := range t.items {
		name, ok := l.estimateName(item)
		switch {
		case !ok:
		case !slices.Contains(compared, name):
			l.add(problem{at: item.at, what: fmt.Sprintf("%s is preferred but not compared", name), write: "Add it to estimates, or leave it out here."})
		case slices.ContainsFunc(names, func(other string) bool { return blockOf(other) == blockOf(name) }):
			l.add(problem{at: item.at, what: fmt.Sprintf("two estimates of %s are preferred", blockOf(name)), why: "They are made from the same data, so one of them enters.", write: "Keep one."})
		default:
			names = append(names, name)
		}
	}
	return names
}

// blockOf is the block that an estimate belongs to: of a probe, or its own.
func blockOf(estimate string) string {
	if strings.HasPrefix(estimate, "reported.") {
		return estimate
	}
	return estimate[:strings.LastIndex(estimate, ".")]
}

// estimateList reads references to the estimates to compare.
func (l *loader) estimateList(t term) (names []string) {
	if t.kind == badTerm {
		return nil
	}
	if t.kind != listTerm {
		l.add(problem{at: t.at, what: "estimates is a list of references", write: "Write estimates = [lensing.shapes.nfw, …]."})
		return nil
	}
	seen := map[string]bool{}
	for _, item := range t.items {
		name, ok := l.estimateName(item)
		if ok && seen[name] {
			l.fail(item.at, "%s stands twice in estimates", name)
		}
		seen[name] = true
		names = append(names, name)
	}
	if len(t.items) < 2 {
		l.add(problem{at: t.at, what: "two estimates or more are needed to compare", write: "Name another one, or leave the reconcile block out."})
	}
	return names
}

// estimateName resolves a reference to an estimate or a reported mass.
func (l *loader) estimateName(t term) (string, bool) {
	switch t.kind {
	case badTerm:
		return "", false
	case referenceTerm:
	default:
		l.notAReference(t, "an estimate is named by reference")
		return "", false
	}
	name := strings.Join(t.path, ".")
	all := l.estimateNames()
	if slices.Contains(all, name) {
		return name, true
	}
	p := problem{at: t.at, absence: true, what: fmt.Sprintf("there is no estimate %s", name)}
	var within []string // estimates of a block that was named instead
	for _, other := range all {
		if strings.HasPrefix(other, name+".") {
			within = append(within, other)
		}
	}
	switch {
	case t.path[0] == "reconcile":
		p.what, p.absence = fmt.Sprintf("%s refers to itself", name), false
		p.write = "Name the estimates: " + enumerate(all, "%s", "and") + "."
	case len(within) > 0:
		p.what, p.absence = fmt.Sprintf("%s names a block, not an estimate", name), false
		p.write = "Write " + enumerate(within, "%s", "or") + "."
	default:
		p.write = didYouMean(name, all, "%s")
		if len(all) > 0 && p.write == "" {
			p.write = "The estimates are " + enumerate(all, "%s", "and") + "."
		}
	}
	l.add(p)
	return "", false
}

// notAReference reports a term that should have been a reference.
func (l *loader) notAReference(t term, what string) {
	p := problem{at: t.at, what: what, write: "Write it like lensing.shapes.nfw, without quotes."}
	if t.kind == textTerm && slices.Contains(l.estimateNames(), t.text) {
		p.write = fmt.Sprintf("Write %s without quotes.", t.text)
	}
	l.add(p)
}

// estimateNames returns the full names of all estimates of the recipe, readable
// or not, in order.
func (l *loader) estimateNames() []string {
	var names []string
	for _, d := range l.blocks {
		b := d.block
		switch {
		case b.Type == "reported":
			names = append(names, "reported."+label(b))
		case slices.ContainsFunc(l.probes, func(p method.Probe) bool { return p.Name == b.Type }):
			for _, inner := range b.Body.Blocks {
				if inner.Type == "estimate" {
					names = append(names, b.Type+"."+label(b)+"."+label(inner))
				}
			}
		}
	}
	return names
}

// radii reads the radii at which masses are compared.
func (l *loader) radii(t term) (all []At) {
	const form = "Write at = [overdensity(500), radius(\"1 Mpc\")]."
	if t.kind == badTerm {
		return nil
	}
	if t.kind != listTerm || len(t.items) == 0 {
		l.add(problem{at: t.at, what: "at is a list of radii", write: form})
		return nil
	}
	seen := map[string]bool{}
	for _, item := range t.items {
		a, ok := l.radius(item)
		if !ok {
			continue
		}
		key := fmt.Sprint(a.Radius, a.Unit, a.Delta, a.Of)
		if seen[key] {
			l.fail(item.at, "%s stands twice in at", a.Text)
		}
		seen[key] = true
		all = append(all, a)
	}
	return all
}

// radius reads overdensity(…) or radius(…).
func (l *loader) radius(t term) (a At, ok bool) {
	a.Range = t.at
	p := problem{at: t.at, what: fmt.Sprintf("a radius is overdensity(…) or radius(…), not %s", t.describe())}
	switch {
	case t.kind == badTerm:
		return a, false
	case t.is("overdensity"):
		a.Delta, a.Of, ok = l.overdensityCall(t)
		a.Text = "overdensity " + short(a.Delta)
		switch a.Of {
		case "mean":
			a.Text += " mean"
		case "virial":
			a.Text = "overdensity virial"
		}
		return a, ok
	case t.is("radius"):
		if !l.count(t, []string{"length"}, 1) {
			return a, false
		}
		x, ok := l.exactScalar(t.items[0], measure{"kpc", true}, "radius")
		if ok && x.value <= 0 {
			l.fail(t.items[0].at, "a radius is positive")
			return a, false
		}
		a.Radius, a.Unit = x.value, x.unit
		a.Text = "radius " + strings.Join(strings.Fields(t.items[0].text), " ")
		return a, ok
	case t.kind == callTerm:
		if !slices.Contains(functions, t.name) {
			l.unknownFunction(t, "overdensity", "radius")
			return a, false
		}
	case t.kind == numberTerm:
		p.write = fmt.Sprintf("Write overdensity(%s), if that is meant.", l.written(t.at))
	case t.kind == textTerm:
		p.write = fmt.Sprintf("Write radius(%q), if that is meant.", t.text)
	}
	l.add(p)
	return a, false
}

// limits reads the sigmas at which the verdict changes its word.
func (l *loader) limits(t term) []float64 {
	s := method.Setting{Name: "limits", Kind: method.List, Low: 1e-3, High: 100}
	v, ok := l.value(t, s)
	if ok && len(v.Numbers) != 3 {
		l.add(problem{at: t.at, what: "limits are three numbers of sigma", why: "They part consistent, strained, in tension and incompatible.", write: "Write limits = [2, 3, 5]."})
	}
	return v.Numbers
}
