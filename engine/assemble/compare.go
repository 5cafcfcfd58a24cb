package assemble

import (
	"context"
	"encoding/json"
	"fmt"

	"steelyard/engine"
	"steelyard/engine/weighing"
	"steelyard/probes/halo"
	"steelyard/probes/infer"
	"steelyard/probes/reconcile"
)

const (
	matchedNode = "reconcile.matched"
	tensionNode = "reconcile.tension"
)

// comparison is what the tension node puts out: the part of a weighing that
// concerns several estimates.
type comparison struct {
	At          map[string][]weighing.At // by estimate
	Tensions    []weighing.Tension
	Consistency []weighing.Consistency
	Warnings    []string
}

// compareNodes plans the matching of the masses and the tensions between them.
func (p *Plan) compareNodes() []engine.Node {
	c := p.Recipe.Reconcile
	matched := engine.Node{ID: matchedNode, Kind: "reconcile/matched", Version: reconcile.Version, Inputs: c.Estimates, Where: place(c.Range)}
	matched.Params = append(p.backgroundFacts(), fmt.Sprintf("seed = %d", p.Recipe.Sampling.Seed), fmt.Sprintf("radii_from = %q", c.RadiiFrom))
	for _, name := range c.Estimates {
		matched.Params = append(matched.Params, fmt.Sprintf("estimate = %q", name))
	}
	var places []reconcile.At
	for _, at := range c.At {
		places = append(places, p.at(at.Radius, at.Unit, at.Delta, at.Of))
		matched.Params = append(matched.Params, fmt.Sprintf("at = %s %s %q", exact(places[len(places)-1].Radius), exact(at.Delta), at.Of))
	}
	matched.Run = func(_ context.Context, job engine.Job) (engine.Output, error) {
		estimates, err := p.compared(job)
		if err != nil {
			return engine.Output{}, err
		}
		m, err := reconcile.MatchAll(estimates, places, c.RadiiFrom,
			reconcile.Background{Cosmology: p.background, Redshift: p.object.Redshift}, p.sampling(&matched, job).Stream)
		if err != nil {
			return engine.Output{}, err
		}
		return encode(m)
	}

	limits := reconcile.Limits
	copy(limits[:], c.Limits)
	tension := engine.Node{ID: tensionNode, Kind: "reconcile/tension", Version: reconcile.Version, Inputs: []string{matchedNode}, Where: place(c.Range)}
	tension.Params = []string{fmt.Sprintf("seed = %d", p.Recipe.Sampling.Seed), fmt.Sprintf("limits = %s %s %s", exact(limits[0]), exact(limits[1]), exact(limits[2]))}
	tension.Run = func(_ context.Context, job engine.Job) (engine.Output, error) {
		var m reconcile.Matching
		if err := decode(job, matchedNode, &m); err != nil {
			return engine.Output{}, err
		}
		r, err := reconcile.Compare(&m, limits, p.sampling(&tension, job).Stream)
		if err != nil {
			return engine.Output{}, err
		}
		b, err := json.Marshal(compared(&m, r))
		return engine.Output{Bytes: b}, err
	}
	return []engine.Node{matched, tension}
}

func (p *Plan) at(radius float64, unit string, delta float64, of string) reconcile.At {
	if of != "" {
		return reconcile.At{Definition: halo.Definition{Delta: delta, Of: of}}
	}
	if unit == "rad" {
		radius *= p.background.AngularDiameter(p.object.Redshift)
	}
	return reconcile.At{Radius: radius}
}

// compared reads the draws of the estimates that the recipe compares.
func (p *Plan) compared(job engine.Job) ([]reconcile.Estimate, error) {
	blocks := map[string]string{}
	for _, e := range p.estimates {
		blocks[e.name] = e.block
	}
	var out []reconcile.Estimate
	for _, name := range p.Recipe.Reconcile.Estimates {
		draws := new(infer.Draws)
		if err := decode(job, name, draws); err != nil {
			return nil, err
		}
		out = append(out, reconcile.Estimate{Name: name, Block: blocks[name], Draws: draws})
	}
	return out, nil
}

func compared(m *reconcile.Matching, r *reconcile.Result) *comparison {
	c := &comparison{At: map[string][]weighing.At{}, Warnings: r.Warnings}
	for _, place := range m.Places {
		for _, mark := range place.Marks {
			c.At[mark.Name] = append(c.At[mark.Name], weighing.At{
				At: place.At.String(), Radius: mark.Radius, Mass: weighing.Interval(mark.Mass),
				LnMean: mark.LnMean, LnSD: mark.LnSD, Extrapolated: mark.Extrapolated,
			})
		}
	}
	for _, t := range r.Tensions {
		radii := "matched"
		if t.Own {
			radii = reconcile.Own
		}
		c.Tensions = append(c.Tensions, weighing.Tension{
			At: t.At, A: t.A, B: t.B, Radii: radii, Ratio: weighing.Interval(t.Ratio),
			Sigma: t.Sigma, Tail: t.Tail, PValue: t.P, PFamily: t.PFamily, SameData: t.SameData,
		})
	}
	for _, k := range r.Consistency {
		c.Consistency = append(c.Consistency, weighing.Consistency{
			At: k.At, Chi2: k.Chi2, Dof: k.Dof, PValue: k.P, Sigma: k.Sigma, Tail: k.Tail, Verdict: k.Verdict, Of: k.Of,
		})
	}
	return c
}
