package recipes

import (
	"fmt"
	"slices"
	"strings"

	"github.com/hashicorp/hcl/v2"
	"github.com/hashicorp/hcl/v2/hclsyntax"

	"steelyard/probes/method"
)

// estimate reads one estimate; the method is nil when it is not known.
func (l *loader) estimate(b, outer *hclsyntax.Block, p method.Probe, given []string) (Estimate, *method.Declaration) {
	e := Estimate{Name: l.name(b, "first"), Settings: method.Settings{}, Range: b.DefRange()}
	m, at := l.method(b, p)
	if m == nil {
		l.check(b.Body, vocabulary{block: "an estimate of " + p.Name, settings: append([]string{"method"}, assumptions(p)...)})
		l.anyway(b.Body, p)
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
				if !l.has(outer.Body, s.Name) {
					l.byDefault(e.Settings, s, b, fmt.Sprintf("estimate %q", e.Name))
				}
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
func (l *loader) byDefault(into method.Settings, s method.Setting, b *hclsyntax.Block, where string) {
	if s.Default.Set {
		v := s.Default
		if v.Unit == "" && (s.Kind == method.Number || s.Kind == method.Exact || s.Kind == method.Measured || s.Kind == method.Span || s.Kind == method.List) {
			v.Unit = s.Unit
		}
		into[s.Name] = v
		return
	}
	if s.Required && !l.has(b.Body, s.Name) {
		l.add(problem{at: b.DefRange(), absence: true, what: fmt.Sprintf("%s needs %s", where, s.Name), why: sentenceOf(s.Doc), write: "Write " + sample(s) + "."})
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
