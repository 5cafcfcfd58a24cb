package recipes

import (
	"fmt"
	"path/filepath"
	"strings"

	"github.com/hashicorp/hcl/v2"
	"github.com/hashicorp/hcl/v2/hclsyntax"
)

// declared is one block of one file.
type declared struct {
	block *hclsyntax.Block
	own   bool // stands in the recipe itself, not in an included file
}

// key identifies a block within a recipe.
func (d *declared) key() string {
	return strings.Join(append([]string{d.block.Type}, d.block.Labels...), "\x00")
}

// readAll reads the recipe and everything it includes.
func (l *loader) readAll(path string) *source {
	read := map[string]*source{}
	var stack []string // files being read, outermost first
	var visit func(name string, from *hcl.Range) *source
	visit = func(name string, from *hcl.Range) *source {
		real := realPath(name)
		for i, open := range stack {
			if realPath(open) == real {
				l.add(problem{at: *from, what: "the files include each other in a circle",
					why: strings.Join(append(append([]string{}, stack[i:]...), name), " includes ") + ".", write: "Take one of these includes out."})
				l.damaged = true
				return nil
			}
		}
		if s, done := read[real]; done {
			return s
		}
		s := l.readSource(name, from)
		read[real] = s
		if s == nil {
			l.damaged = true
			return nil
		}
		l.recipe.Files = append(l.recipe.Files, name)
		stack = append(stack, name)
		for _, t := range l.includes(s) {
			file := t.text
			if !filepath.IsAbs(file) {
				file = filepath.Join(filepath.Dir(name), file)
			}
			if inner := visit(file, &t.at); inner != nil {
				s.includes = append(s.includes, inner)
			}
		}
		stack = stack[:len(stack)-1]
		return s
	}
	return visit(path, nil)
}

// includes returns the files that a file asks for, and refuses every other
// attribute outside a block.
func (l *loader) includes(s *source) []term {
	var files []term
	for _, a := range sorted(s.body) {
		if a.Name != "include" {
			p := problem{at: a.NameRange, what: fmt.Sprintf("%s stands outside every block", a.Name)}
			if near := nearest(a.Name, []string{"include"}); near != "" {
				p.write = "Did you mean include?"
			} else if home := homeOf[a.Name]; home != "" {
				p.write = fmt.Sprintf("Write it inside %s { … }.", home)
			} else {
				p.write = "Only include = [\"file.hcl\"] can stand there."
			}
			l.add(p)
			continue
		}
		t := l.attributeTerm(a)
		if t.kind != listTerm {
			if t.kind != badTerm {
				l.add(problem{at: t.at, what: "include is a list of files", write: "Write include = [\"file.hcl\"]."})
			}
			continue
		}
		for _, item := range t.items {
			switch {
			case item.kind == badTerm:
			case item.kind != textTerm || item.text == "":
				l.add(problem{at: item.at, what: "include is a list of files, each in quotes", write: "Write include = [\"file.hcl\"]."})
			default:
				files = append(files, item)
			}
		}
	}
	return files
}

// homeOf says in which block a setting belongs that stands outside of any.
var homeOf = map[string]string{
	"redshift": "object", "centre": "object", "hubble_constant": "cosmology", "omega_matter": "cosmology", "omega_lambda": "cosmology",
	"w0": "cosmology", "wa": "cosmology", "cmb_temperature": "cosmology", "draws": "sampling", "seed": "sampling",
	"estimates": "reconcile", "at": "reconcile", "radii_from": "reconcile", "limits": "reconcile", "preferred": "reconcile", "combined": "reconcile",
}

// merged returns the blocks that stand for a recipe: its own, then those of its
// includes that it does not replace.
func (l *loader) merged(top *source) []*declared {
	done := map[*source][]*declared{}
	var merge func(s *source) []*declared
	merge = func(s *source) []*declared {
		if ds, ok := done[s]; ok {
			return ds
		}
		at := map[string]*declared{}
		var all []*declared
		for _, b := range s.body.Blocks {
			d := &declared{block: b, own: s == top}
			if b.Type == "object" && !d.own {
				l.add(problem{at: b.TypeRange, what: "an included file cannot declare the object", write: "Write the object block in the recipe."})
				continue
			}
			all = append(all, d) // a second one is read for its mistakes
			first := at[d.key()]
			if first == nil {
				at[d.key()] = d
				continue
			}
			if !single[b.Type] {
				l.add(problem{at: b.DefRange(), what: fmt.Sprintf("%s is declared twice", title(b)), why: fmt.Sprintf("It was declared already at %s.", l.where(first.block.DefRange())),
					write: "Give one of them another name, or put their contents into one block."})
			}
		}
		replaced := map[string]bool{}
		for _, d := range all {
			replaced[d.key()] = true
		}
		for _, inner := range s.includes {
			for _, d := range merge(inner) {
				if replaced[d.key()] {
					continue
				}
				if first := at[d.key()]; first != nil {
					if first.block != d.block {
						l.add(problem{at: d.block.DefRange(), what: fmt.Sprintf("%s comes from two included files", title(d.block)),
							why: fmt.Sprintf("The other one is at %s.", l.where(first.block.DefRange())), write: fmt.Sprintf("Take one out, or declare it in %s, which replaces both.", s.name)})
					}
					continue
				}
				at[d.key()] = d
				all = append(all, d)
			}
		}
		done[s] = all[:len(all):len(all)]
		return all
	}
	return merge(top)
}

// title names a block as it is written: xray "spectra".
func title(b *hclsyntax.Block) string {
	text := b.Type
	for _, name := range b.Labels {
		text += fmt.Sprintf(" %q", name)
	}
	return text
}

// singles checks the blocks of which there is exactly one, or at most one.
func (l *loader) singles(blocks []*declared) {
	first := map[string]*hclsyntax.Block{}
	for _, d := range blocks {
		b := d.block
		if !single[b.Type] {
			continue
		}
		if first[b.Type] == nil {
			first[b.Type] = b
			if b.Type != "object" && len(b.Labels) > 0 {
				l.add(problem{at: b.LabelRanges[0], what: fmt.Sprintf("%s has no name", b.Type), write: fmt.Sprintf("Write %s { … }.", b.Type)})
			}
			continue
		}
		p := problem{at: b.DefRange(), what: fmt.Sprintf("there is a second %s", b.Type), why: fmt.Sprintf("The first is at %s.", l.where(first[b.Type].DefRange()))}
		p.write = "Keep one of the two."
		if b.Type == "object" {
			p.write = "A recipe weighs one object; write another recipe for the other."
		}
		l.add(p)
	}
	if first["object"] == nil && len(blocks) > 0 {
		l.missing("no object is declared", "", "Write object \"name\" { … } with redshift = … and centre = sky(…, …).")
	}
}
