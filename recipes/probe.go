package recipes

import (
	"fmt"
	"slices"
	"strings"

	"github.com/hashicorp/hcl/v2"
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
		if name == "method" || name == "halo" {
			return "It belongs to an estimate."
		}
		return ""
	}})
	inner := l.once(b.Body.Blocks, title(b))
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
	if complete && len(used) > 0 {
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

// estimate reads one estimate; the method is nil when it is not known.
func (l *loader) estimate(b, outer *hclsyntax.Block, p method.Probe, given []string) (Estimate, *method.Declaration) {
	e := Estimate{Name: l.name(b, "first"), Settings: method.Settings{}, Range: b.DefRange()}
	m, at := l.method(b, p)
	if m == nil {
		l.check(b.Body, vocabulary{block: "an estimate of " + p.Name, settings: append([]string{"method"}, assumptions(p)...)})
		return e, nil
	}
	e.Method = m.Name
	l.check(b.Body, vocabulary{block: "method " + m.Name, settings: append([]string{"method"}, settingNames(m.Settings)...), explain: func(name string) string {
		if others := havers(p, name); len(others) > 0 {
			return fmt.Sprintf("Methods that have it: %s.", enumerate(others, "%s", "and"))
		}
		if slices.ContainsFunc(p.Blocks, func(d method.Block) bool { return d.Name == name }) {
			return fmt.Sprintf("%s is a data block: it stands beside the estimate, as %s { … }.", name, name)
		}
		return ""
	}})
	l.needsData(*m, at, outer, given)
	for _, s := range m.Settings {
		t, own := l.attribute(b.Body, s.Name)
		if !own {
			if t, own = l.attribute(outer.Body, s.Name); !own {
				l.byDefault(e.Settings, s, b.DefRange(), fmt.Sprintf("estimate %q", e.Name))
				continue
			}
		}
		if v, ok := l.value(t, s); ok {
			e.Settings[s.Name] = v
			l.behindTheLens(t, s, v)
		}
	}
	return e, m
}

// method finds the method of an estimate and the place that names it.
func (l *loader) method(b *hclsyntax.Block, p method.Probe) (*method.Declaration, hcl.Range) {
	names := methodNames(p)
	if !l.require(b.Body, b.DefRange(), title(b), "method", "", fmt.Sprintf("Write method = %q; %s has %s.", names[0], p.Name, enumerate(names, "%q", "and"))) {
		return nil, b.DefRange()
	}
	t, _ := l.attribute(b.Body, "method")
	var planned []string
	for _, name := range plannedMethods[p.Name] {
		if !slices.Contains(names, name) {
			planned = append(planned, name)
		}
	}
	if t.kind == badTerm {
		return nil, t.at
	}
	name, ok := l.oneOf(t, "a method of "+p.Name, names, planned)
	if !ok {
		return nil, t.at
	}
	for i := range p.Methods {
		if p.Methods[i].Name == name {
			return &p.Methods[i], t.at
		}
	}
	return nil, t.at
}

// byDefault fills in what holds when the recipe is silent.
func (l *loader) byDefault(into method.Settings, s method.Setting, at hcl.Range, where string) {
	if s.Default.Set {
		v := s.Default
		if v.Unit == "" && (s.Kind == method.Number || s.Kind == method.Exact || s.Kind == method.Measured || s.Kind == method.Span || s.Kind == method.List) {
			v.Unit = s.Unit
		}
		into[s.Name] = v
		return
	}
	if s.Required {
		l.add(problem{at: at, absence: true, what: fmt.Sprintf("%s needs %s", where, s.Name), why: sentenceOf(s.Doc), write: "Write " + sample(s) + "."})
	}
}

// sample shows how a setting is written.
func sample(s method.Setting) string {
	value := measure{s.Unit, s.Length}.example()
	switch s.Kind {
	case method.Measured:
		value = measure{s.Unit, s.Length}.measuredExample()
	case method.Integer:
		value = "10"
		if float64(10) < s.Low || s.High != 0 && s.High < 10 {
			value = short(s.Low)
		}
	case method.Choice:
		value = enumerate(s.Choices, "%q", "or")
	case method.Choices:
		value = "[" + enumerateList(s.Choices) + "]"
	case method.Span:
		value = "[lower, upper], each like " + value
	case method.List:
		value = "[" + value + ", …]"
	case method.Flag:
		value = "true or false"
	case method.Text:
		value = "\"…\""
	case method.Overdensity:
		value = "500"
	}
	return s.Name + " = " + value
}

// sentenceOf makes a doc comment a sentence.
func sentenceOf(doc string) string {
	if doc = strings.TrimSpace(doc); doc == "" {
		return ""
	}
	return sentence(doc)
}

// behindTheLens checks that sources lie behind the object.
func (l *loader) behindTheLens(t term, s method.Setting, v method.Value) {
	z := l.recipe.Object.Redshift
	if s.Name == "source_redshift" && z > 0 && v.Prior.IsExact() && v.Prior.A <= z {
		l.add(problem{at: t.at, what: "the sources are not behind the object", why: fmt.Sprintf("Their redshift is %s, and the object's is %s: its mass bends no light of theirs.", short(v.Prior.A), short(z))})
	}
}

// needsData checks that the block has the data that the method works on.
func (l *loader) needsData(m method.Declaration, at hcl.Range, outer *hclsyntax.Block, given []string) {
	if len(m.Data) == 0 {
		return
	}
	var satisfied [][]string
	for _, set := range m.Data {
		if containsAll(given, set) {
			satisfied = append(satisfied, set)
		}
	}
	if len(satisfied) == 0 {
		var ways []string
		for _, set := range m.Data {
			ways = append(ways, enumerate(set, "%s", "and"))
		}
		why := fmt.Sprintf("%s has no data block.", title(outer))
		if len(given) > 0 {
			why = fmt.Sprintf("%s has only %s.", title(outer), enumerate(given, "%s", "and"))
		}
		l.add(problem{at: at, absence: true, what: fmt.Sprintf("method %s lacks its data", m.Name),
			why: why, write: fmt.Sprintf("It needs %s.", strings.Join(ways, ", or "))})
		return
	}
	for i, a := range satisfied {
		for _, b := range satisfied[:i] {
			if !containsAll(a, b) && !containsAll(b, a) {
				l.add(problem{at: at, what: fmt.Sprintf("it is not clear which data method %s is to use", m.Name),
					why:   fmt.Sprintf("%s has %s, and also %s.", title(outer), enumerate(b, "%s", "and"), enumerate(a, "%s", "and")),
					write: "Put them into two blocks, each with its estimates."})
				return
			}
		}
	}
}

func containsAll(list, wanted []string) bool {
	for _, name := range wanted {
		if !slices.Contains(list, name) {
			return false
		}
	}
	return true
}
