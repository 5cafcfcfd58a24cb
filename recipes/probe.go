package recipes

import (
	"fmt"
	"slices"

	"github.com/hashicorp/hcl/v2/hclsyntax"

	"steelyard/probes/method"
)

// probeBlock reads one probe's block: its data, the assumptions that hold for
// all its estimates, and the estimates.
func (l *loader) probeBlock(b *hclsyntax.Block, p method.Probe) {
	out := Block{Probe: p.Name, Name: l.name(b, "first"), Range: b.DefRange()}
	blocks := []string{"estimate"}
	for _, d := range p.Blocks {
		blocks = append(blocks, d.Name)
	}
	l.check(b.Body, vocabulary{block: p.Name, settings: assumptions(p), blocks: blocks, planned: plannedData[p.Name], explain: func(name string) string {
		if name == "method" {
			return "It belongs to an estimate."
		}
		for _, other := range l.probes {
			if len(havers(other, name)) > 0 {
				return fmt.Sprintf("It belongs to %s, for the method %s.", other.Name, enumerate(havers(other, name), "%s", "or"))
			}
		}
		return ""
	}})
	inner := b.Body.Blocks
	l.once(inner, title(b))
	var given []string // the data blocks, nested ones as "profile.sources"
	for _, d := range inner {
		for _, declared := range p.Blocks {
			if d.Type == declared.Name {
				out.Data = append(out.Data, l.data(d, declared))
				given = append(given, declared.Name)
				for _, n := range d.Body.Blocks {
					given = append(given, declared.Name+"."+n.Type)
				}
			}
		}
	}
	var used []method.Declaration
	complete := true // every estimate's method is known
	for _, d := range inner {
		if d.Type != "estimate" {
			continue
		}
		e, m := l.estimate(d, b, p, given)
		out.Estimates = append(out.Estimates, e)
		if m == nil {
			complete = false
			continue
		}
		used = append(used, *m)
	}
	if complete && len(used) == 0 {
		l.add(problem{at: b.DefRange(), absence: true, what: fmt.Sprintf("%s makes no estimate", title(b)),
			write: fmt.Sprintf("Write estimate \"name\" { method = %q } inside.", methodNames(p)[0])})
	}
	if !complete {
		l.anyway(b.Body, p)
	} else if len(used) > 0 {
		l.unusedAssumptions(b, p, used)
	}
	l.recipe.Blocks = append(l.recipe.Blocks, out)
}

// assumptions returns the names of all settings that some method of the probe
// has.
func assumptions(p method.Probe) []string {
	var names []string
	for _, m := range p.Methods {
		for _, s := range m.Settings {
			if !slices.Contains(names, s.Name) {
				names = append(names, s.Name)
			}
		}
	}
	return names
}

func methodNames(p method.Probe) []string {
	names := make([]string, len(p.Methods))
	for i, m := range p.Methods {
		names[i] = m.Name
	}
	if len(names) == 0 {
		names = []string{"…"}
	}
	return names
}

// unusedAssumptions reports settings of the whole block that no method in it
// has.
func (l *loader) unusedAssumptions(b *hclsyntax.Block, p method.Probe, used []method.Declaration) {
	for _, a := range sorted(b.Body) {
		if !slices.Contains(assumptions(p), a.Name) || slices.ContainsFunc(used, func(m method.Declaration) bool { return setting(m, a.Name) != nil }) {
			continue
		}
		l.add(problem{at: a.NameRange, what: fmt.Sprintf("no estimate of %s has the setting %s", title(b), a.Name),
			why: fmt.Sprintf("Methods that have it: %s.", enumerate(havers(p, a.Name), "%s", "and")), write: "Leave it out, or change the method."})
	}
}

// setting returns the method's setting of that name, or nil.
func setting(m method.Declaration, name string) *method.Setting {
	for i := range m.Settings {
		if m.Settings[i].Name == name {
			return &m.Settings[i]
		}
	}
	return nil
}

// anyway reads the settings of a body for their mistakes where the method is not
// known, as the first method has them that has them.
func (l *loader) anyway(b *hclsyntax.Body, p method.Probe) {
	for _, a := range sorted(b) {
		for _, m := range p.Methods {
			if s := setting(m, a.Name); s != nil {
				l.value(l.attributeTerm(a), *s)
				break
			}
		}
	}
}

// havers names the methods of the probe that have the setting.
func havers(p method.Probe, name string) []string {
	var names []string
	for _, m := range p.Methods {
		if setting(m, name) != nil {
			names = append(names, m.Name)
		}
	}
	return names
}
