package recipes

import (
	"fmt"
	"slices"

	"github.com/hashicorp/hcl/v2"
	"github.com/hashicorp/hcl/v2/hclsyntax"

	"steelyard/probes/units"
)

// nuisanceNames notes the names of the nuisances before any of them is read.
func (l *loader) nuisanceNames() {
	for _, d := range l.blocks {
		if d.block.Type == "nuisance" {
			l.nuisances[label(d.block)] = nil
		}
	}
}

// nuisanceBlock reads one nuisance.
func (l *loader) nuisanceBlock(b *hclsyntax.Block) {
	name := l.name(b, "shear_bias")
	l.check(b.Body, vocabulary{block: "nuisance", settings: []string{"prior"}})
	if !l.require(b.Body, b.DefRange(), "nuisance", "prior", "", "Write prior = normal(mean, sd), or another prior.") {
		return
	}
	t, _ := l.attribute(b.Body, "prior")
	if t.kind == referenceTerm && t.path[0] == "nuisance" {
		l.nuisanceReference(t, name)
		return
	}
	m := measure{unit: l.unitOf(t)}
	p, unit, ok := l.prior(t, m, "prior")
	if !ok {
		return
	}
	if p.IsExact() {
		l.add(problem{at: t.at, what: "a nuisance needs a prior, not a number", why: "It is drawn anew for every draw of a mass. A number that is known exactly is no nuisance.",
			write: "Write prior = normal(mean, sd), or the number itself where it is used."})
		return
	}
	n := Nuisance{Name: name, Prior: p, Unit: unit, Range: b.DefRange()}
	l.recipe.Nuisances = append(l.recipe.Nuisances, n)
	l.nuisances[name] = &n
	l.nuisanceTerms[name] = t
}

// nuisanceReference reports a nuisance that refers to another one, and a circle
// of them once as such.
func (l *loader) nuisanceReference(t term, name string) {
	circle := []string{name}
	next := t
	for len(next.path) == 2 && next.path[0] == "nuisance" && len(circle) <= len(l.nuisances) {
		if next.path[1] == name {
			if slices.Min(circle) == name {
				why := ""
				for _, member := range circle {
					why += "nuisance." + member + " refers to "
				}
				l.add(problem{at: t.at, what: "nuisances refer to each other in a circle", why: why + "nuisance." + name + ".", write: "Write a prior, like normal(1.0, 0.05)."})
			}
			return
		}
		circle = append(circle, next.path[1])
		b := l.nuisanceBody(next.path[1])
		if b == nil {
			break
		}
		var given bool
		if next, given = l.attribute(b, "prior"); !given {
			break
		}
	}
	l.add(problem{at: t.at, what: "a nuisance needs a prior of its own", why: fmt.Sprintf("nuisance.%s and %s would be the same quantity.", name, t.describe()),
		write: fmt.Sprintf("Write a prior, or refer to %s where this one is used.", t.describe())})
}

func (l *loader) nuisanceBody(name string) *hclsyntax.Body {
	for _, d := range l.blocks {
		if d.block.Type == "nuisance" && label(d.block) == name {
			return d.block.Body
		}
	}
	return nil
}

// nuisance resolves a reference; nil when it cannot be.
func (l *loader) nuisance(t term) *Nuisance {
	if len(t.path) != 2 {
		l.add(problem{at: t.at, what: fmt.Sprintf("%s is not a reference to a nuisance", t.describe()), write: "Write nuisance.NAME."})
		return nil
	}
	n, known := l.nuisances[t.path[1]]
	if !known {
		var names []string
		for name := range l.nuisances {
			names = append(names, "nuisance."+name)
		}
		slices.Sort(names)
		p := problem{at: t.at, absence: true, what: fmt.Sprintf("there is no %s", t.describe()), write: didYouMean(t.describe(), names, "%s")}
		if p.write == "" {
			p.write = fmt.Sprintf("Declare it: nuisance %q { prior = normal(mean, sd) }.", t.path[1])
		}
		l.add(p)
	}
	return n
}

// unitOf returns the canonical unit of the first quantity in a term, "" for
// pure numbers.
func (l *loader) unitOf(t term) string {
	if t.kind == textTerm {
		if q, err := units.ParseQuantity(t.text); err == nil {
			return standard(q.Unit)
		}
	}
	for _, item := range t.items {
		if unit := l.unitOf(item); unit != "" {
			return unit
		}
	}
	return ""
}

// noteUses notes every nuisance that some block names, whether or not it can be
// read.
func (l *loader) noteUses() {
	var walk func(b *hclsyntax.Body)
	walk = func(b *hclsyntax.Body) {
		for _, a := range b.Attributes {
			for _, traversal := range hclsyntax.Variables(a.Expr) {
				if traversal.RootName() != "nuisance" || len(traversal) < 2 {
					continue
				}
				if step, ok := traversal[1].(hcl.TraverseAttr); ok {
					l.used[step.Name] = true
				}
			}
		}
		for _, inner := range b.Blocks {
			walk(inner.Body)
		}
	}
	for _, d := range l.blocks {
		walk(d.block.Body)
	}
}
