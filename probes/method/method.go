// Package method describes, as data, what a probe can be asked in a recipe:
// its data blocks with their columns, its methods with their settings and
// assumptions, and where each comes from in the literature.
//
// The recipe reader checks a recipe against these declarations, the manual
// prints them, and the graph hashes the values they give rise to. Nothing here
// computes.
package method

import (
	"fmt"
	"sort"
	"strconv"
	"strings"

	"steelyard/probes/prior"
)

// Probe is everything a recipe may say about one kind of probe.
type Probe struct {
	Name    string // the block type: "xray", "lensing", "dynamics"
	Doc     string // one sentence
	Blocks  []Block
	Methods []Declaration
}

// Block is one data block inside a probe's block: `temperature`, `galaxies`,
// `bins`. A block with Columns has `file` unless Model settings replace it.
type Block struct {
	Name     string
	Doc      string
	Columns  []Column  // columns of the file; empty for a block without a file
	Settings []Setting // everything in the block that is not a column
	Blocks   []Block   // nested blocks (`covariance`, `sources`)
	Select   bool      // whether `select` is understood
	// FileOptional says that the block may be given without a file (for
	// example by a published model's parameters or a single quoted value).
	FileOptional bool
	// Alternatives lists sets of columns of which exactly one must be given
	// whole, for example {{"inner","outer"},{"radius","half_width"}} and
	// {{"error"},{"minus","plus"},{"low","high"}}.
	Alternatives [][][]string
}

// Column is one column a block reads.
type Column struct {
	Name     string
	Unit     string // canonical unit, VOUnits: "kpc", "keV", "cm**-3", "rad", "" for a pure number
	Length   bool   // Unit is kpc and an angle may be given instead
	Text     bool   // holds names rather than numbers
	Required bool   // false also for members of Alternatives
	Doc      string
}

// Kind says what form a setting's value takes.
type Kind uint8

const (
	// Number is a physical assumption: a number or quantity, a prior, or a
	// reference to a shared nuisance.
	Number Kind = iota
	// Exact is a number or quantity without an error.
	Exact
	// Measured is a quantity whose error is part of it ("970 +- 30 km/s").
	Measured
	// Integer is a whole number.
	Integer
	// Choice is one word out of Choices.
	Choice
	// Choices is a list of words out of Choices.
	Choices
	// Span is two quantities, lower and upper.
	Span
	// List is any number of quantities, in rising order.
	List
	// Flag is true or false.
	Flag
	// Text is free text.
	Text
	// Overdensity is a bare number (times critical) or overdensity(...).
	Overdensity
)

// Setting is one attribute of a block or an estimate.
type Setting struct {
	Name     string
	Kind     Kind
	Unit     string // canonical unit of the value; "" for a pure number
	Length   bool   // Unit is kpc and an angle may be given instead
	Required bool
	Default  Value   // what holds when the recipe is silent; Set false for nothing
	Low      float64 // permitted range of the value (of a prior: of its median); both zero: any
	High     float64
	Relation []string // names allowed in relation("…"), for `concentration`
	Choices  []string
	Planned  []string // words of the language that are refused because they are not built yet
	Doc      string
	Source   string // the paper of the default or of the assumption
}

// Declaration is what one method says of itself.
type Declaration struct {
	Name     string
	Version  int // raised whenever the same input would give other numbers
	Summary  string
	Equation string     // plain text, one or more lines
	Sources  []string   // papers
	Data     [][]string // alternatives of data blocks it needs, e.g. {{"profile"},{"galaxies","bins"}}
	Settings []Setting  // its settings and its assumptions; may be set for the whole block too
	Cautions []string
	Measured string // measured bias and coverage, with the command that measured them; "" when not yet measured
}

// Value is the value of a setting after the recipe was read: defaults filled
// in, quantities in canonical units, references resolved.
type Value struct {
	Set      bool
	Prior    prior.Prior // Number, Exact, Measured: the value itself, or its distribution
	Nuisance string      // the shared nuisance it refers to; Prior then is the nuisance's
	Relation string      // relation("…")
	Text     string      // Choice, Text; for Overdensity "critical", "mean" or "virial", the number in Prior
	List     []string    // Choices
	Numbers  []float64   // Span, List
	Flag     bool
	Unit     string // canonical unit the numbers are in: the setting's, or "rad" where an angle stands for a length
}

// Exactly returns a set exact value, for defaults.
func Exactly(x float64) Value { return Value{Set: true, Prior: prior.Exact(x)} }

// Word returns a set choice or text, for defaults.
func Word(s string) Value { return Value{Set: true, Text: s} }

// Words returns a set list of words, for defaults.
func Words(s ...string) Value { return Value{Set: true, List: s} }

// Distributed returns a set value with a prior, for defaults. It panics when
// the prior is impossible, for it is called with constants only.
func Distributed(p prior.Prior, err error) Value {
	if err != nil {
		panic("method: " + err.Error())
	}
	return Value{Set: true, Prior: p}
}

// Related returns a set value given by a published relation, for defaults.
func Related(name string) Value { return Value{Set: true, Relation: name} }

// Settings holds the values of one block or estimate by name.
type Settings map[string]Value

// Transcript returns one line per value that is set, sorted by name, each an
// unambiguous and exact rendering: equal settings give equal transcripts and
// different ones differ. It is what a node's key hashes.
func (s Settings) Transcript() []string {
	names := make([]string, 0, len(s))
	for name, v := range s {
		if v.Set {
			names = append(names, name)
		}
	}
	sort.Strings(names)
	lines := make([]string, len(names))
	for i, name := range names {
		lines[i] = name + " = " + s[name].transcript()
	}
	return lines
}

var kinds = map[prior.Kind]string{
	prior.ExactKind: "exact", prior.NormalKind: "normal", prior.HalfNormalKind: "half_normal", prior.LogNormalKind: "lognormal",
	prior.UniformKind: "uniform", prior.LogUniformKind: "loguniform", prior.TwoPieceKind: "two_piece",
}

// transcript writes the prior and, each behind its name, whatever else is set.
func (v Value) transcript() string {
	var b strings.Builder
	fmt.Fprintf(&b, "%s(%s, %s, %s)", kinds[v.Prior.Kind], Digits(v.Prior.A), Digits(v.Prior.B), Digits(v.Prior.C))
	for _, word := range []struct{ name, text string }{
		{"nuisance", v.Nuisance}, {"relation", v.Relation}, {"text", v.Text}, {"unit", v.Unit},
	} {
		if word.text != "" {
			fmt.Fprintf(&b, " %s %q", word.name, word.text)
		}
	}
	if v.Flag {
		b.WriteString(" flag")
	}
	if v.List != nil {
		fmt.Fprintf(&b, " list %q", v.List)
	}
	for i, x := range v.Numbers {
		if i == 0 {
			b.WriteString(" numbers")
		}
		b.WriteString(" " + Digits(x))
	}
	return b.String()
}

// Digits renders a float64 in the fewest decimal digits that give the same bits
// back, with negative zero taken as zero.
func Digits(x float64) string {
	if x == 0 {
		x = 0
	}
	return strconv.FormatFloat(x, 'g', -1, 64)
}
