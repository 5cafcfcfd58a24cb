package recipes

import (
	"fmt"
	"slices"
	"sort"
	"strings"

	"github.com/hashicorp/hcl/v2"
	"github.com/hashicorp/hcl/v2/hclsyntax"
)

// sorted returns the attributes of a body in the order written; the parser
// keeps them in a map.
func sorted(b *hclsyntax.Body) []*hclsyntax.Attribute {
	all := make([]*hclsyntax.Attribute, 0, len(b.Attributes))
	for _, a := range b.Attributes {
		all = append(all, a)
	}
	sort.Slice(all, func(i, j int) bool { return all[i].SrcRange.Start.Byte < all[j].SrcRange.Start.Byte })
	return all
}

// attributeTerm returns the value of an attribute as written.
func (l *loader) attributeTerm(a *hclsyntax.Attribute) term {
	t, done := l.terms[a]
	if !done {
		t = l.term(a.Expr)
		l.terms[a] = t
	}
	return t
}

// has reports whether a setting is given, if only under a misspelt name, so
// that it is not reported as missing as well.
func (l *loader) has(b *hclsyntax.Body, name string) bool {
	return b.Attributes[name] != nil || slices.Contains(l.meant[b], name)
}

// attribute returns the value of the named attribute, if it is given.
func (l *loader) attribute(b *hclsyntax.Body, name string) (t term, given bool) {
	a := b.Attributes[name]
	if a == nil {
		return t, false
	}
	return l.attributeTerm(a), true
}

// vocabulary is what may stand in a block.
type vocabulary struct {
	block    string // how messages call the block
	settings []string
	blocks   []string
	planned  []string                 // blocks and settings that are not built yet
	explain  func(name string) string // why something else does not belong here; "" for no idea
}

// check reports everything in a body that the vocabulary does not have.
func (l *loader) check(b *hclsyntax.Body, v vocabulary) {
	for _, a := range sorted(b) {
		if slices.Contains(v.settings, a.Name) {
			continue
		}
		if near := nearest(a.Name, v.settings); near != "" {
			l.meant[b] = append(l.meant[b], near)
		}
		p := problem{at: a.NameRange, what: fmt.Sprintf("%s has no setting %s", v.block, a.Name)}
		switch {
		case slices.Contains(v.planned, a.Name):
			p.what, p.write = fmt.Sprintf("%s is not built yet", a.Name), "Leave it out for now."
		case slices.Contains(v.blocks, a.Name):
			p.what, p.write = fmt.Sprintf("%s is a block, not a setting", a.Name), fmt.Sprintf("Write %s { … } without the equals sign.", a.Name)
		default:
			if v.explain != nil {
				p.why = v.explain(a.Name)
			}
			if p.why == "" || nearest(a.Name, v.settings) != "" {
				p.write = didYouMean(a.Name, slices.Concat(v.settings, v.blocks), "%s")
			}
		}
		l.attributeTerm(a) // its own mistakes are worth knowing too
		l.add(p)
	}
	for _, inner := range b.Blocks {
		if slices.Contains(v.blocks, inner.Type) {
			continue
		}
		p := problem{at: inner.TypeRange, what: fmt.Sprintf("%s has no block %s", v.block, inner.Type)}
		switch {
		case slices.Contains(v.planned, inner.Type):
			p.what, p.write = fmt.Sprintf("%s blocks are not built yet", inner.Type), "Leave the block out for now."
		case slices.Contains(v.settings, inner.Type):
			p.what, p.write = fmt.Sprintf("%s is a setting, not a block", inner.Type), fmt.Sprintf("Write %s = … .", inner.Type)
		default:
			if v.explain != nil {
				p.why = v.explain(inner.Type)
			}
			near := nearest(inner.Type, v.settings)
			switch {
			case nearest(inner.Type, v.blocks) == "" && near != "":
				p.write = fmt.Sprintf("Did you mean the setting %s?", near)
			case p.why == "":
				p.write = didYouMean(inner.Type, v.blocks, "%s")
			}
		}
		l.add(p)
	}
}

// name checks the labels of a block that others refer to, and returns it. With
// an unusable label the block is still read, for its mistakes.
func (l *loader) name(b *hclsyntax.Block, example string) string {
	p := problem{at: b.TypeRange}
	switch {
	case len(b.Labels) == 0:
		p.what, p.write = fmt.Sprintf("this %s needs a name", b.Type), fmt.Sprintf("Write %s %q { … }.", b.Type, example)
	case len(b.Labels) > 1:
		p.at = b.LabelRanges[1]
		p.what, p.write = fmt.Sprintf("%s takes one name", b.Type), fmt.Sprintf("Write %s %q { … }.", b.Type, b.Labels[0])
	case !hclsyntax.ValidIdentifier(b.Labels[0]):
		p.at = b.LabelRanges[0]
		p.what = fmt.Sprintf("%q cannot be referred to", b.Labels[0])
		p.why = "A name begins with a letter and goes on with letters, digits, _ and -."
		if plain := strings.Join(strings.Fields(b.Labels[0]), "_"); hclsyntax.ValidIdentifier(plain) {
			p.write = fmt.Sprintf("Write %q.", plain)
		} else if plain != "" && hclsyntax.ValidIdentifier("a"+plain) {
			p.write = fmt.Sprintf("Put a letter before it, like %q.", example+"_"+plain)
		}
	default:
		return b.Labels[0]
	}
	l.add(p)
	return label(b)
}

// once reports blocks with the type and labels of an earlier one.
func (l *loader) once(blocks hclsyntax.Blocks, in string) {
	first := map[string]*hclsyntax.Block{}
	for _, b := range blocks {
		key := (&declared{block: b}).key()
		if first[key] == nil {
			first[key] = b
			continue
		}
		l.add(problem{at: b.DefRange(), what: fmt.Sprintf("%s has a second %s", in, title(b)), why: fmt.Sprintf("The first is at %s.", l.where(first[key].DefRange()))})
	}
}

// require reports a setting that is not given.
func (l *loader) require(b *hclsyntax.Body, at hcl.Range, block, name, why, write string) bool {
	if !l.has(b, name) {
		l.add(problem{at: at, absence: true, what: fmt.Sprintf("%s needs %s", block, name), why: why, write: write})
	}
	return b.Attributes[name] != nil
}
