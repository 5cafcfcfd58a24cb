package assemble

import (
	"fmt"
	"maps"
	"slices"

	"steelyard/engine"
	"steelyard/probes/method"
	"steelyard/probes/reported"
)

// declared returns the settings of an estimate and those its method declares.
func (p *Plan) declared(name string) (method.Settings, []method.Setting) {
	for _, b := range p.Recipe.Blocks {
		for _, e := range b.Estimates {
			if b.Probe+"."+b.Name+"."+e.Name == name {
				return e.Settings, findMethod(probe(b.Probe), e.Method).Settings
			}
		}
	}
	for _, m := range p.Recipe.Reported {
		if "reported."+m.Name == name {
			return m.Settings, reported.Settings()
		}
	}
	panic("assemble: there is no estimate " + name)
}

// variant plans an estimate once more, with some of its settings replaced, as a
// node of its own: the estimate's name with a suffix.
func (p *Plan) variant(name, suffix string, replaced method.Settings) (engine.Node, error) {
	for _, b := range p.Recipe.Blocks {
		for _, e := range b.Estimates {
			full := b.Probe + "." + b.Name
			if full+"."+e.Name != name {
				continue
			}
			e.Settings = maps.Clone(e.Settings)
			maps.Copy(e.Settings, replaced)
			at := slices.IndexFunc(p.Nodes, func(n engine.Node) bool { return n.ID == name })
			pr := probe(b.Probe)
			n := p.estimateNode(full, findMethod(pr, e.Method), pr, b, e, p.Nodes[at].Inputs)
			n.ID += suffix
			return n, nil
		}
	}
	for _, m := range p.Recipe.Reported {
		if "reported."+m.Name == name {
			m.Settings = maps.Clone(m.Settings)
			maps.Copy(m.Settings, replaced)
			n, err := p.reportedNode(m)
			n.ID += suffix
			return n, err
		}
	}
	return engine.Node{}, fmt.Errorf("there is no estimate %s", name)
}
