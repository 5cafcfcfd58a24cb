package assemble

import (
	"cmp"
	"context"
	"encoding/json"
	"fmt"
	"math"
	"slices"
	"strings"

	"steelyard/engine"
	"steelyard/engine/weighing"
	"steelyard/probes/catalogue"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/prior"
	"steelyard/recipes"
)

// sensitivityVersion is raised when the same draws would give other changes.
const sensitivityVersion = 1

// sensitivityNodes plans every estimate that can be made with less of its data:
// without its innermost and its outermost bin, or with the cut that makes members
// moved by one step either way.
func (p *Plan) sensitivityNodes(ctx context.Context, o Outcome, c *comparison) ([]engine.Node, error) {
	var nodes []engine.Node
	for _, e := range p.estimates {
		if !finished(o, e.name) || !finished(o, e.masses) {
			continue
		}
		var s weighing.Estimate
		if err := read(ctx, o, e.masses, &s); err != nil {
			return nil, err
		}
		places := c.At[e.name]
		if places == nil {
			places = ownPlace(s)
		}
		for _, less := range p.lessData(e.name, s.Covers) {
			n := changeNode(e.name, less, places)
			for _, extra := range append(less.nodes, n) {
				if !p.trials[extra.ID] { // two estimates of one block have their data in common
					p.trials[extra.ID] = true
					nodes = append(nodes, extra)
				}
			}
			p.ranges = append(p.ranges, n.ID)
		}
	}
	return nodes, nil
}

// ownPlace stands in where nothing is compared: the estimate's own R_500.
func ownPlace(s weighing.Estimate) []weighing.At {
	for _, own := range s.Own {
		if own.Of == "critical" && own.Overdensity == 500 {
			return []weighing.At{{At: "overdensity 500", Radius: own.Radius.Median}}
		}
	}
	return nil
}

// less is one way of making an estimate with less data.
type less struct {
	words string        // "without the innermost bin"
	nodes []engine.Node // what it takes, the estimate last
}

func (p *Plan) lessData(name string, covers [2]float64) []less {
	for _, b := range p.Recipe.Blocks {
		for _, e := range b.Estimates {
			if b.Probe+"."+b.Name+"."+e.Name != name {
				continue
			}
			switch {
			case slices.ContainsFunc(b.Data, func(d recipes.Data) bool { return d.Kind == "temperature" && d.Path != "" }):
				return p.withoutRows(name, b, "temperature")
			case b.Probe == "dynamics":
				return p.movedCut(name, b)
			default:
				return p.withoutBins(name, covers)
			}
		}
	}
	return nil // a published mass has no data to leave out
}

// withoutBins narrows the range that the estimate's method fits by a hair, so
// that the bin at the end no longer lies wholly inside it.
func (p *Plan) withoutBins(name string, covers [2]float64) []less {
	_, declared := p.declared(name)
	if !slices.ContainsFunc(declared, func(d method.Setting) bool { return d.Name == "fit_within" }) {
		return nil
	}
	const hair = 1e-6
	var out []less
	for _, end := range []struct {
		words string
		span  []float64
	}{
		{"without the innermost bin", []float64{covers[0] * (1 + hair), covers[1] * (1 + hair)}},
		{"without the outermost bin", []float64{covers[0] * (1 - hair), covers[1] * (1 - hair)}},
	} {
		n, err := p.variant(name, " "+end.words, method.Settings{"fit_within": {Set: true, Numbers: end.span, Unit: "kpc"}})
		if err == nil {
			out = append(out, less{end.words, []engine.Node{n}})
		}
	}
	return out
}

// withoutRows drops the first or the last row, by radius, of the table of a data
// block.
func (p *Plan) withoutRows(name string, b recipes.Block, kind string) []less {
	full := b.Probe + "." + b.Name
	table, reduced := full+"."+kind+".table", full+"."+kind+".reduced"
	var out []less
	for _, end := range []string{"innermost", "outermost"} {
		words := "without the " + end + " bin"
		cut := engine.Node{ID: table + " " + words, Kind: "table/cut", Version: sensitivityVersion, Params: []string{words}, Inputs: []string{table}}
		cut.Run = func(_ context.Context, job engine.Job) (engine.Output, error) {
			var t catalogue.Table
			if err := decode(job, table, &t); err != nil {
				return engine.Output{}, err
			}
			short, err := withoutRow(&t, end == "outermost")
			if err != nil {
				return engine.Output{}, err
			}
			return encode(short)
		}
		pr := probe(b.Probe)
		again := p.reductionNode(reduced+" "+words, full, findReduction(pr, kind), pr, b, map[string]string{kind: cut.ID})
		n, err := p.variant(name, " "+words, nil)
		if err != nil {
			return nil
		}
		at := slices.Index(n.Inputs, reduced)
		if at < 0 {
			return nil
		}
		n = p.onInputs(name, " "+words, slices.Concat(n.Inputs[:at:at], []string{again.ID}, n.Inputs[at+1:]))
		out = append(out, less{words, []engine.Node{cut, again, n}})
	}
	return out
}

// withoutRow leaves the row at one end out.
func withoutRow(t *catalogue.Table, outermost bool) (*catalogue.Table, error) {
	radius := t.Values("outer")
	if radius == nil {
		radius = t.Values("radius")
	}
	if len(radius) < 2 {
		return nil, fmt.Errorf("there is no bin to leave out")
	}
	order := make([]int, len(radius))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int { return cmp.Compare(radius[a], radius[b]) })
	drop := order[0]
	if outermost {
		drop = order[len(order)-1]
	}
	slices.Sort(order)
	return t.Pick(slices.Delete(order, drop, drop+1)), nil
}

// step is by which factor the cut between members and field is moved.
const step = 1.2

// usualGap is the fixed gap, in km/s, that moves in place of one that follows the
// density (Fadda et al. 1996).
const usualGap = 1000

// movedCut widens and narrows the cut that makes members: the gap of the shifting
// gapper, the clip of the others.
func (p *Plan) movedCut(name string, b recipes.Block) []less {
	full, pr := b.Probe+"."+b.Name, probe(b.Probe)
	members := method.Settings{}
	declared := findBlock(pr.Blocks, "members")
	for _, d := range declared.Settings {
		if d.Default.Set {
			members[d.Name] = d.Default
		}
	}
	at := slices.IndexFunc(b.Data, func(d recipes.Data) bool { return d.Kind == "members" })
	if at >= 0 {
		for setting, v := range b.Data[at].Settings {
			if v.Set {
				members[setting] = v
			}
		}
	}
	cut := "clip"
	if members["method"].Text == "shifting-gapper" {
		cut = "gap"
		if !members[cut].Set { // it then follows the density of the galaxies
			members[cut] = method.Value{Set: true, Prior: prior.Exact(usualGap), Unit: "km/s"}
		}
	}
	if !members[cut].Set || members["method"].Text == "given" || !slices.ContainsFunc(b.Data, func(d recipes.Data) bool { return d.Kind == "galaxies" }) {
		return nil
	}
	var out []less
	for _, by := range []float64{1 / step, step} {
		changed := method.Settings{}
		for setting, v := range members {
			changed[setting] = v
		}
		v := members[cut]
		v.Prior.A *= by
		changed[cut] = v
		other := b
		other.Data = append(slices.DeleteFunc(slices.Clone(b.Data), func(d recipes.Data) bool { return d.Kind == "members" }), recipes.Data{Kind: "members", Settings: changed})
		words := fmt.Sprintf("with the members' %s at %.4g", cut, v.Prior.A)
		again := p.reductionNode(full+".members.reduced "+words, full, findReduction(pr, "members"), pr, other, map[string]string{"galaxies": full + ".galaxies.table"})
		out = append(out, less{words, []engine.Node{again, p.onInputs(name, " "+words, []string{again.ID})}})
	}
	return out
}

// onInputs plans an estimate once more, on other reductions.
func (p *Plan) onInputs(name, suffix string, inputs []string) engine.Node {
	for _, b := range p.Recipe.Blocks {
		for _, e := range b.Estimates {
			if full := b.Probe + "." + b.Name; full+"."+e.Name == name {
				pr := probe(b.Probe)
				n := p.estimateNode(full, findMethod(pr, e.Method), pr, b, e, inputs)
				n.ID += suffix
				return n
			}
		}
	}
	panic("assemble: there is no estimate " + name)
}

// changeNode compares the masses with less data to those with all of it.
func changeNode(name string, l less, places []weighing.At) engine.Node {
	variant := l.nodes[len(l.nodes)-1].ID
	n := engine.Node{ID: "sensitivity of " + variant, Kind: "sensitivity", Version: sensitivityVersion, Inputs: []string{name, variant}}
	n.Params = []string{fmt.Sprintf("estimate = %q", name), fmt.Sprintf("change = %q", l.words)}
	for _, at := range places {
		n.Params = append(n.Params, fmt.Sprintf("at = %q %s", at.At, exact(at.Radius)))
	}
	n.Run = func(_ context.Context, job engine.Job) (engine.Output, error) {
		var all, some infer.Draws
		if err := decode(job, name, &all); err != nil {
			return engine.Output{}, err
		}
		if err := decode(job, variant, &some); err != nil {
			return engine.Output{}, err
		}
		var out []weighing.Sensitivity
		for _, at := range places {
			before, ok := all.LnMassesAt(math.Log(at.Radius))
			after, too := some.LnMassesAt(math.Log(at.Radius))
			if !ok || !too {
				continue
			}
			x, y := infer.Percentiles(before, 16, 50, 84), infer.Percentiles(after, 16, 50, 84)
			out = append(out, weighing.Sensitivity{
				Estimate: name, Change: l.words, At: at.At, Radius: at.Radius,
				Mass:     weighing.Interval{Lo: math.Exp(y[0]), Median: math.Exp(y[1]), Hi: math.Exp(y[2])},
				LnChange: y[1] - x[1], InSD: 2 * (y[1] - x[1]) / (x[2] - x[0]),
			})
		}
		b, err := json.Marshal(out)
		return engine.Output{Bytes: b}, err
	}
	return n
}

// sensitivities reads the changes; an estimate that cannot be made with less data
// says so in a warning.
func (p *Plan) sensitivities(ctx context.Context, o Outcome, w *weighing.Weighing) error {
	for _, id := range p.ranges {
		if !finished(o, id) {
			w.Warnings = append(w.Warnings, strings.TrimPrefix(id, "sensitivity of ")+": the estimate cannot be made")
			continue
		}
		var list []weighing.Sensitivity
		if err := read(ctx, o, id, &list); err != nil {
			return err
		}
		w.Sensitivity = append(w.Sensitivity, list...)
	}
	return nil
}
