package recipes

import (
	"fmt"
	"strings"
	"unicode"
	"unicode/utf8"

	"github.com/hashicorp/hcl/v2"
	"github.com/hashicorp/hcl/v2/hclsyntax"

	"steelyard/probes/method"
)

// Load reads the recipe at path and the files it includes, and checks it
// against what the probes declare. The reported argument declares attributes of
// `reported` blocks beyond those of the language itself, or in other words than
// it. The recipe is nil when the diagnostics hold an error.
func Load(path string, probes []method.Probe, reported []method.Setting) (*Recipe, Diagnostics) {
	l := &loader{
		report: newReport(), recipe: &Recipe{File: path}, probes: probes, reported: reportedSettings(reported),
		terms: map[*hclsyntax.Attribute]term{}, meant: map[*hclsyntax.Body][]string{}, nuisances: map[string]*Nuisance{}, nuisanceTerms: map[string]term{}, used: map[string]bool{},
	}
	if top := l.readAll(path); top != nil {
		l.declare(l.merged(top))
	}
	ds := l.diagnostics()
	if ds.HasErrors() {
		return nil, ds
	}
	return l.recipe, ds
}

// loader reads one recipe.
type loader struct {
	*report
	recipe   *Recipe
	probes   []method.Probe
	reported []method.Setting

	terms         map[*hclsyntax.Attribute]term // each read once, so that its mistakes are reported once
	meant         map[*hclsyntax.Body][]string  // settings given under a misspelt name
	nuisances     map[string]*Nuisance          // by name; nil for one that could not be read
	nuisanceTerms map[string]term
	used          map[string]bool // nuisances that something refers to
	background    *Cosmology      // the one in which overdensities are meant; nil while unreadable
	blocks        []*declared     // those that stand for the recipe
	centreFor     hcl.Range       // a data block that needs the object's centre
}

// reader reads the blocks of one type.
type reader struct {
	kind string
	read func(*hclsyntax.Block)
}

// single lists the blocks that a recipe has once.
var single = map[string]bool{"object": true, "cosmology": true, "sampling": true, "reconcile": true}

// declare checks the blocks that stand for the recipe, in an order in which
// everything referred to is known before it is needed.
func (l *loader) declare(blocks []*declared) {
	l.blocks = blocks
	if len(blocks) == 0 {
		l.missing("the recipe declares nothing", "", "Write at least object \"name\" { … }, cosmology { … } and one xray, lensing, dynamics or reported block.")
	}
	l.noteUses()
	readers := []reader{
		{"object", l.object},
		{"cosmology", l.cosmology},
		{"sampling", l.sampling},
		{"nuisance", l.nuisanceBlock},
		{"reported", l.reportedBlock},
	}
	for _, p := range l.probes {
		readers = append(readers, reader{p.Name, func(b *hclsyntax.Block) { l.probeBlock(b, p) }})
	}
	readers = append(readers, reader{"reconcile", l.reconcile})

	l.recipe.Sampling = defaultSampling
	known := []string{}
	for _, r := range readers {
		known = append(known, r.kind)
	}
	for _, d := range blocks {
		l.knownBlock(d.block, known)
	}
	l.singles(blocks)
	for _, r := range readers {
		if r.kind == "nuisance" {
			l.nuisanceNames()
		}
		for _, d := range blocks {
			if d.block.Type == r.kind && (!single[r.kind] || d.block == l.first(r.kind)) {
				r.read(d.block)
			}
		}
	}
	l.wholeRecipe()
}

// knownBlock reports a block that the language does not have, or not yet.
func (l *loader) knownBlock(b *hclsyntax.Block, known []string) {
	for _, name := range known {
		if b.Type == name {
			return
		}
	}
	p := problem{at: b.TypeRange}
	if plannedBlocks[b.Type] != "" {
		p.what = fmt.Sprintf("%s blocks are not built yet", b.Type)
		p.why = fmt.Sprintf("The language has them (%s), and this version of the program cannot read them.", plannedBlocks[b.Type])
		p.write = "Leave the block out for now."
	} else {
		p.what = fmt.Sprintf("there is no block %s", b.Type)
		p.write = didYouMean(b.Type, known, "%s")
		if b.Type == "include" {
			p.write = "Write include = [\"file.hcl\"]."
		}
		for _, inner := range []string{"estimate", "members", "bins", "galaxies", "profile", "density", "temperature", "dispersion"} {
			if b.Type == inner {
				p.what, p.write = fmt.Sprintf("%s stands inside the block of a probe", inner), "Move it into xray, lensing or dynamics."
			}
		}
	}
	l.add(p)
}

// missing reports something that should stand in a file and does not.
func (l *loader) missing(what, why, write string) {
	l.add(problem{at: hcl.Range{Filename: l.recipe.File}, what: what, why: why, write: write, absence: true})
}

// wholeRecipe checks what only the recipe as a whole can tell.
func (l *loader) wholeRecipe() {
	if len(l.blocks) == 0 {
		return // reported as a whole
	}
	if l.first("cosmology") == nil {
		l.missing("no cosmology is stated", "Every mass depends on it.", "Write cosmology { … } with hubble_constant = \"70 km/s/Mpc\" and omega_matter = 0.3, or whichever background is meant.")
	}
	weighs := l.first("reported") != nil
	for _, p := range l.probes {
		weighs = weighs || l.first(p.Name) != nil
	}
	for _, d := range l.blocks {
		weighs = weighs || d.block.Type == "rotation" // refused above
	}
	if !weighs {
		l.missing("nothing is declared to weigh the object by", "", "Write at least one xray, lensing, dynamics or reported block.")
	}
	if l.centreFor.Filename != "" && !l.recipe.Object.HasCentre {
		if o := l.first("object"); o != nil && !l.has(o.Body, "centre") {
			l.add(problem{at: o.DefRange(), absence: true, what: "the object needs its centre",
				why:   fmt.Sprintf("The positions read at %s are taken relative to it.", l.where(l.centreFor)),
				write: "Write centre = sky(\"14h01m02.1s\", \"+02d52m42s\"), or in degrees: sky(210.2588, 2.8783)."})
		}
	}
	for _, d := range l.blocks {
		if name := label(d.block); d.block.Type == "nuisance" && !l.used[name] && d.own && l.nuisances[name] != nil {
			l.add(problem{at: d.block.DefRange(), warning: true, what: fmt.Sprintf("nuisance.%s is never used", name),
				write: fmt.Sprintf("Refer to it as nuisance.%s where it matters, or leave it out.", name)})
		}
	}
}

// first returns the first block of a type, or nil.
func (l *loader) first(kind string) *hclsyntax.Block {
	for _, d := range l.blocks {
		if d.block.Type == kind {
			return d.block
		}
	}
	return nil
}

// label returns the only label of a block, "" where it has none.
func label(b *hclsyntax.Block) string {
	if len(b.Labels) == 0 {
		return ""
	}
	return b.Labels[0]
}

// sentence makes a message one: a capital first, a full stop last.
func sentence(s string) string {
	r, n := utf8.DecodeRuneInString(s)
	s = string(unicode.ToUpper(r)) + s[n:]
	if !strings.HasSuffix(s, ".") && !strings.HasSuffix(s, "?") && !strings.HasSuffix(s, ")") {
		s += "."
	}
	return s
}
