package history

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strings"
	"time"

	"steelyard/cache"
	"steelyard/engine/weighing"
)

// Comparison is what changed from one weighing to another: what went in, and
// what came out.
type Comparison struct {
	Schema      string             `json:"schema"` // "steelyard/since/1"
	Object      weighing.Object    `json:"object"`
	From        Mark               `json:"from"`
	To          Mark               `json:"to"`
	Files       []FileChange       `json:"files"`
	Assumptions []Change           `json:"assumptions"`
	Program     []Change           `json:"program"`
	Appeared    []string           `json:"appeared"` // estimates
	Gone        []string           `json:"gone"`     // estimates
	Masses      []MassMove         `json:"masses"`
	Combined    []MassMove         `json:"combined"` // masses of all together
	Tensions    []TensionMove      `json:"tensions"`
	Consistency []ConsistencyMove  `json:"consistency"`
	Failures    []weighing.Failure `json:"failures"` // of the second weighing
}

// Mark names a weighing.
type Mark struct {
	Number   uint64    `json:"number"`
	Finished time.Time `json:"finished"`
	Program  string    `json:"program"`
}

// MarkOf names an entry of the history.
func MarkOf(w cache.Weighing) Mark { return Mark{w.Number, w.Finished, w.Program} }

// FileChange is a data file that is not what it was. From or To is "" when it
// was not or is no longer read.
type FileChange struct {
	Path string   `json:"path"`
	From string   `json:"from"` // digest of the content
	To   string   `json:"to"`
	Of   []string `json:"of"` // the data blocks it belongs to
}

// Change is an assumption, or something about the program, that is not what it
// was. From or To is "" when it is new or gone.
type Change struct {
	Name string `json:"name"`
	From string `json:"from"`
	To   string `json:"to"`
}

// MassMove is how far a mass moved. Moved is in units of the first weighing's
// error on the side to which it moved.
type MassMove struct {
	Estimate string            `json:"estimate"`
	Inside   string            `json:"inside"` // "overdensity 500", "radius 1000 kpc"
	Own      bool              `json:"own"`    // inside the estimate's own radius, not a matched one
	From     weighing.Interval `json:"from"`
	To       weighing.Interval `json:"to"`
	Moved    *float64          `json:"moved,omitempty"` // absent without an error
}

// TensionMove is how far the ratio of two masses moved, in units of the first
// weighing's error on the side to which it moved, and its significance.
type TensionMove struct {
	At        string            `json:"at"`
	A         string            `json:"a"`
	B         string            `json:"b"`
	From      weighing.Interval `json:"from"`
	To        weighing.Interval `json:"to"`
	Moved     *float64          `json:"moved,omitempty"`
	SigmaFrom float64           `json:"sigma_from"`
	SigmaTo   float64           `json:"sigma_to"`
}

// ConsistencyMove is what became of the agreement of all.
type ConsistencyMove struct {
	At          string  `json:"at"`
	SigmaFrom   float64 `json:"sigma_from"`
	SigmaTo     float64 `json:"sigma_to"`
	VerdictFrom string  `json:"verdict_from"`
	VerdictTo   string  `json:"verdict_to"`
}

// Compare says what changed from one weighing to another.
func Compare(from, to *Past, first, second Mark) *Comparison {
	c := &Comparison{
		Schema: "steelyard/since/1", Object: to.Weighing.Object, From: first, To: second,
		Files: compareFiles(from, to), Assumptions: []Change{}, Program: []Change{}, Appeared: []string{}, Gone: []string{},
		Masses: []MassMove{}, Combined: []MassMove{}, Tensions: []TensionMove{}, Consistency: []ConsistencyMove{}, Failures: []weighing.Failure{},
	}
	c.Failures = append(c.Failures, to.Weighing.Failures...)
	c.inputs(from, to)
	c.masses(from.Weighing, to.Weighing)
	c.tensions(from.Weighing, to.Weighing)
	return c
}

// Same says whether nothing that went in differs.
func (c *Comparison) Same() bool {
	return len(c.Files)+len(c.Assumptions)+len(c.Program) == 0
}

// compareFiles compares the content of the data files by their paths.
func compareFiles(from, to *Past) []FileChange {
	changes := []FileChange{}
	at := map[string]int{}
	add := func(p *Past, digest func(*FileChange) *string) {
		for i := range p.Nodes {
			n := &p.Nodes[i]
			for k, d := range n.digests("file") {
				if k >= len(n.Files) {
					break
				}
				path := n.Files[k]
				if _, ok := at[path]; !ok {
					at[path] = len(changes)
					changes = append(changes, FileChange{Path: path})
				}
				c := &changes[at[path]]
				*digest(c) = d
				if block := strings.TrimSuffix(n.ID, ".table"); !slices.Contains(c.Of, block) {
					c.Of = append(c.Of, block)
				}
			}
		}
	}
	add(from, func(c *FileChange) *string { return &c.From })
	add(to, func(c *FileChange) *string { return &c.To })
	return slices.DeleteFunc(changes, func(c FileChange) bool { return c.From == c.To })
}

func (c *Comparison) masses(from, to *weighing.Weighing) {
	before := map[string]weighing.Estimate{}
	for _, e := range from.Estimates {
		before[e.Name] = e
	}
	for _, now := range to.Estimates {
		was, ok := before[now.Name]
		if !ok {
			c.Appeared = append(c.Appeared, now.Name)
			continue
		}
		delete(before, now.Name)
		for _, m := range now.Own {
			if i := slices.IndexFunc(was.Own, func(w weighing.Own) bool { return inside(w) == inside(m) }); i >= 0 {
				c.Masses = append(c.Masses, MassMove{now.Name, inside(m), true, was.Own[i].Mass, m.Mass, moved(was.Own[i].Mass, m.Mass)})
			}
		}
		for _, m := range now.At {
			if i := slices.IndexFunc(was.At, func(w weighing.At) bool { return w.At == m.At }); i >= 0 {
				c.Masses = append(c.Masses, MassMove{now.Name, m.At, false, was.At[i].Mass, m.Mass, moved(was.At[i].Mass, m.Mass)})
			}
		}
	}
	for _, e := range from.Estimates {
		if _, left := before[e.Name]; left {
			c.Gone = append(c.Gone, e.Name)
		}
	}
}

// inside names an overdensity as the places of comparison are named. The number
// of a virial one follows the cosmology and is left out.
func inside(m weighing.Own) string {
	switch m.Of {
	case "critical":
		return fmt.Sprintf("overdensity %g", m.Overdensity)
	case "virial":
		return "overdensity virial"
	}
	return fmt.Sprintf("overdensity %g %s", m.Overdensity, m.Of)
}

// moved is how far a value moved in units of the error it had on that side.
func moved(from, to weighing.Interval) *float64 {
	by, side := to.Median-from.Median, from.Hi-from.Median
	if by < 0 {
		side = from.Median - from.Lo
	}
	if by != 0 {
		by /= side
	}
	if math.IsNaN(by) || math.IsInf(by, 0) {
		return nil
	}
	return &by
}

func (c *Comparison) tensions(from, to *weighing.Weighing) {
	for _, now := range to.Tensions {
		i := slices.IndexFunc(from.Tensions, func(t weighing.Tension) bool { return t.At == now.At && t.A == now.A && t.B == now.B })
		if i < 0 {
			continue
		}
		was := from.Tensions[i]
		c.Tensions = append(c.Tensions, TensionMove{now.At, now.A, now.B, was.Ratio, now.Ratio, moved(was.Ratio, now.Ratio), was.Sigma, now.Sigma})
	}
	for _, now := range to.Combined {
		if i := slices.IndexFunc(from.Combined, func(m weighing.Combined) bool { return m.At == now.At }); i >= 0 {
			was := from.Combined[i].Mass
			c.Combined = append(c.Combined, MassMove{"combined", now.At, false, was, now.Mass, moved(was, now.Mass)})
		}
	}
	for _, now := range to.Consistency {
		i := slices.IndexFunc(from.Consistency, func(k weighing.Consistency) bool { return k.At == now.At })
		if i < 0 {
			continue
		}
		was := from.Consistency[i]
		c.Consistency = append(c.Consistency, ConsistencyMove{now.At, was.Sigma, now.Sigma, was.Verdict, now.Verdict})
	}
}

// inputs compares what the nodes of both weighings depended on, apart from files
// and from each other's outputs. What changed in many nodes is said once.
func (c *Comparison) inputs(from, to *Past) {
	if c.From.Program != c.To.Program {
		c.Program = append(c.Program, Change{"program", c.From.Program, c.To.Program})
	}
	for i := range to.Nodes {
		now := &to.Nodes[i]
		before := from.node(now.ID)
		if before == nil || strings.Contains(now.ID, " ") { // an estimate made again under another prior
			continue
		}
		otherMethod := before.Kind != now.Kind
		for _, x := range changes(before, now) {
			switch {
			case strings.HasPrefix(x.Fact, "file "), strings.HasPrefix(x.Fact, "output of "), x.Fact == "order of the facts":
			case x.Fact == "name": // of a file: the files say so
			case now.Kind == "masses" && x.Fact != "version", strings.HasPrefix(x.Fact, "own"): // follows from the comparison
			case strings.HasSuffix(x.Fact, "_version"):
				note(&c.Program, Change{"version of " + strings.TrimSuffix(x.Fact, "_version"), x.From, x.To})
			case x.Fact == "version" && !otherMethod:
				note(&c.Program, Change{"version of " + now.Kind, x.From, x.To})
			case x.Fact == "arithmetic", x.Fact == "layout of keys":
				note(&c.Program, Change{x.Fact, x.From, x.To})
			case x.Fact == "kind":
				note(&c.Assumptions, Change{now.ID + ": method", methodOf(x.From), methodOf(x.To)})
			case otherMethod && (x.From == "" || x.To == "" || x.Fact == "version"): // a setting of one method alone
			default:
				c.Assumptions = noteParameter(c.Assumptions, now, x.Fact, x.From, x.To)
			}
		}
	}
	slices.SortStableFunc(c.Program, func(a, b Change) int { return cmp.Compare(a.Name, b.Name) })
}

func methodOf(kind string) string {
	_, name, _ := strings.Cut(kind, "/")
	return name
}

// note adds a change unless it is there.
func note(list *[]Change, x Change) {
	if !slices.Contains(*list, x) {
		*list = append(*list, x)
	}
}

// noteParameter adds a parameter under the name it has in the recipe.
func noteParameter(list []Change, n *Node, fact, from, to string) []Change {
	x := Change{Name: inRecipe(n, fact)}
	x.From, x.To = readablePair(fact, from, to)
	if from == "" {
		x.From = ""
	}
	if to == "" {
		x.To = ""
	}
	if from == "present" || to == "present" {
		x.From, x.To = strings.Replace(x.From, "present", "there", 1), strings.Replace(x.To, "present", "there", 1)
	}
	note(&list, x)
	return list
}

// inRecipe is where a node's parameter stands in the recipe:
// "lensing.shapes.nfw.concentration", "lensing.shapes.bins.count", "seed".
func inRecipe(n *Node, fact string) string {
	block := n.ID
	if parts := strings.SplitN(n.ID, ".", 3); len(parts) == 3 {
		block = parts[0] + "." + parts[1]
	}
	owner, name, dotted := strings.Cut(fact, ".")
	switch {
	case n.Kind == "table":
		return strings.TrimSuffix(n.ID, ".table") + "." + strings.TrimPrefix(fact, "column.")
	case dotted && (owner == "estimate" || owner == "reported"):
		return n.ID + "." + name
	case dotted:
		return block + "." + fact
	case strings.HasPrefix(n.ID, "reconcile."):
		switch fact {
		case "radii_from", "limits":
			return "reconcile." + fact
		}
		if base, _, _ := strings.Cut(fact, " ("); base == "at" || base == "estimate" || base == "preferred" {
			return "reconcile." + fact
		}
	case fact == "stated_cosmology":
		return n.ID + ".cosmology"
	}
	return fact
}
