package recipes

import (
	"fmt"
	"slices"

	"github.com/hashicorp/hcl/v2/hclsyntax"

	"steelyard/probes/method"
)

// alternatives checks that of each group of sets exactly one is given whole.
func (l *loader) alternatives(b *hclsyntax.Block, d method.Block) {
	is := func(name string) bool {
		if l.has(b.Body, name) {
			return true
		}
		return slices.ContainsFunc(b.Body.Blocks, func(n *hclsyntax.Block) bool { return n.Type == name })
	}
	for _, group := range d.Alternatives {
		var given, ways []string
		onlyColumns := true
		for _, set := range group {
			if len(set) > 0 {
				ways = append(ways, enumerate(set, "%s", "and"))
			}
			for _, name := range set {
				if is(name) && !slices.Contains(given, name) {
					given = append(given, name)
				}
				onlyColumns = onlyColumns && slices.Contains(columnNames(d), name)
			}
		}
		if onlyColumns && !l.has(b.Body, "file") {
			continue // without a file there are no columns
		}
		whole := slices.ContainsFunc(group, func(set []string) bool { return len(set) == len(given) && containsAll(given, set) })
		if whole {
			continue
		}
		p := problem{at: b.DefRange(), absence: len(given) == 0, write: "Write either " + joinWays(ways) + "."}
		if len(ways) == 1 {
			p.write = "Write " + ways[0] + "."
		}
		var lacking []string // of the first set that what is given belongs to
		for _, set := range group {
			if containsAll(set, given) {
				for _, name := range set {
					if !is(name) {
						lacking = append(lacking, name)
					}
				}
				break
			}
		}
		switch {
		case len(given) == 0:
			p.what = fmt.Sprintf("%s needs %s", d.Name, joinWays(ways))
			p.write = ""
		case len(lacking) > 0:
			p.absence = true
			p.what = fmt.Sprintf("%s has %s without %s", d.Name, enumerate(given, "%s", "and"), enumerate(lacking, "%s", "and"))
		default:
			p.what = fmt.Sprintf("%s cannot be given together", enumerate(given, "%s", "and"))
			if a := b.Body.Attributes[given[len(given)-1]]; a != nil {
				p.at = a.NameRange
			}
		}
		l.add(p)
	}
}

// joinWays writes alternatives.
func joinWays(ways []string) string {
	text := ""
	for i, way := range ways {
		if i > 0 {
			text += ", or "
		}
		text += way
	}
	return text
}
