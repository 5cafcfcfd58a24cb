package assemble

import (
	"context"
	"encoding/json"
	"fmt"
	"slices"

	"steelyard/engine"
	"steelyard/probes/halo"
	"steelyard/probes/infer"
	"steelyard/probes/reconcile"
	"steelyard/recipes"
)

// Nodes of the comparison.
const (
	sharedNode  = "reconcile.shared"
	matchedNode = "reconcile.matched"
	tensionNode = "reconcile.tension"
)

// source is the node that an estimate is compared by, and the priors of shared
// nuisances it was made with in place of the recipe's.
type source struct {
	node  string
	tilts []reconcile.Tilt
}

// sources are the estimates as the recipe has them.
func (p *Plan) sources() map[string]source {
	out := map[string]source{}
	for _, name := range p.Recipe.Reconcile.Estimates {
		out[name] = source{node: name}
	}
	return out
}

// compareNodes plans what the estimates share, the matching of their masses and
// the tensions between them. suffix tells several comparisons apart.
func (p *Plan) compareNodes(from map[string]source, suffix string) []engine.Node {
	c := p.Recipe.Reconcile
	var inputs []string
	facts := append(p.backgroundFacts(), fmt.Sprintf("seed = %d", p.Recipe.Sampling.Seed))
	for _, name := range c.Estimates {
		inputs = append(inputs, from[name].node)
		if from[name].tilts != nil {
			inputs = append(inputs, name)
		}
		facts = append(facts, fmt.Sprintf("estimate = %q", name))
		for _, t := range from[name].tilts {
			facts = append(facts, fmt.Sprintf("tilt = %q %q %s %s", name, t.Nuisance, exact(t.Mean), exact(t.SD)))
		}
	}
	shared := engine.Node{ID: sharedNode + suffix, Kind: "reconcile/shared", Version: reconcile.Version, Inputs: inputs, Where: place(c.Range)}
	shared.Params = append(slices.Clone(facts), fmt.Sprintf("infer_version = %d", infer.Version))
	shared.Run = func(ctx context.Context, job engine.Job) (engine.Output, error) {
		estimates, err := p.compared(job, from)
		if err != nil {
			return engine.Output{}, err
		}
		joint, err := reconcile.Share(ctx, estimates, p.sampling(&shared, job).Stream)
		if err != nil {
			return engine.Output{}, err
		}
		return encode(joint)
	}

	setup := p.setup()
	matched := engine.Node{ID: matchedNode + suffix, Kind: "reconcile/matched", Version: reconcile.Version, Inputs: append(slices.Clone(inputs), shared.ID), Where: place(c.Range)}
	matched.Params = append(slices.Clone(facts), setupFacts(setup)...)
	matched.Run = func(_ context.Context, job engine.Job) (engine.Output, error) {
		s := setup
		var err error
		if s.Estimates, err = p.compared(job, from); err != nil {
			return engine.Output{}, err
		}
		var joint reconcile.Joint
		if err := decode(job, shared.ID, &joint); err != nil {
			return engine.Output{}, err
		}
		m, err := reconcile.MatchAll(s, &joint, p.sampling(&matched, job).Stream)
		if err != nil {
			return engine.Output{}, err
		}
		return encode(m)
	}

	limits := p.limits()
	tension := engine.Node{ID: tensionNode + suffix, Kind: "reconcile/tension", Version: reconcile.Version, Inputs: []string{matched.ID}, Where: place(c.Range)}
	tension.Params = append(p.backgroundFacts(), fmt.Sprintf("seed = %d", p.Recipe.Sampling.Seed), fmt.Sprintf("limits = %s %s %s", exact(limits[0]), exact(limits[1]), exact(limits[2])))
	tension.Run = func(_ context.Context, job engine.Job) (engine.Output, error) {
		var m reconcile.Matching
		if err := decode(job, matched.ID, &m); err != nil {
			return engine.Output{}, err
		}
		r, err := reconcile.Compare(&m, limits, p.sampling(&tension, job).Stream)
		if err != nil {
			return engine.Output{}, err
		}
		found, err := compared(&m, r, setup.Background)
		if err != nil {
			return engine.Output{}, err
		}
		b, err := json.Marshal(found)
		return engine.Output{Bytes: b}, err
	}
	return []engine.Node{shared, matched, tension}
}

func (p *Plan) limits() [3]float64 {
	limits := reconcile.Limits
	copy(limits[:], p.Recipe.Reconcile.Limits)
	return limits
}

// setup says what the recipe compares, but for the draws.
func (p *Plan) setup() reconcile.Setup {
	c := p.Recipe.Reconcile
	s := reconcile.Setup{
		RadiiFrom: c.RadiiFrom, Preferred: c.Preferred, Own: p.definitions(),
		Background: reconcile.Background{Cosmology: p.background, Redshift: p.object.Redshift},
	}
	for _, at := range c.At {
		s.Places = append(s.Places, p.at(at.Radius, at.Unit, at.Delta, at.Of))
	}
	return s
}

// setupFacts are what a node that matches depends on besides the estimates. A
// place is told by its numbers, not by how the recipe writes it.
func setupFacts(s reconcile.Setup) []string {
	facts := []string{fmt.Sprintf("radii_from = %q", s.RadiiFrom)}
	for _, at := range s.Places {
		facts = append(facts, fmt.Sprintf("at = %s %s %q", exact(at.Radius), exact(at.Definition.Delta), at.Definition.Of))
	}
	for _, d := range s.Own {
		facts = append(facts, fmt.Sprintf("own = %s %q", exact(d.Delta), d.Of))
	}
	for _, name := range s.Preferred {
		facts = append(facts, fmt.Sprintf("preferred = %q", name))
	}
	return facts
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
func (p *Plan) compared(job engine.Job, from map[string]source) ([]reconcile.Estimate, error) {
	data := p.sameData()
	var out []reconcile.Estimate
	for _, name := range p.Recipe.Reconcile.Estimates {
		draws := new(infer.Draws)
		if err := decode(job, from[name].node, draws); err != nil {
			return nil, err
		}
		e := reconcile.Estimate{Name: name, Block: data[name], Draws: draws, Tilts: from[name].tilts}
		if e.Tilts != nil {
			e.Alone = new(infer.Draws)
			if err := decode(job, name, e.Alone); err != nil {
				return nil, err
			}
		}
		out = append(out, e)
	}
	return out, nil
}

// sameData gives each estimate the name of the block whose data it is made from:
// of several blocks of one probe that read a common file, the first.
func (p *Plan) sameData() map[string]string {
	first := map[string]string{} // by block
	for i, b := range p.Recipe.Blocks {
		name := b.Probe + "." + b.Name
		first[name] = name
		for _, earlier := range p.Recipe.Blocks[:i] {
			if earlier.Probe == b.Probe && shareFile(earlier.Data, b.Data) {
				first[name] = first[earlier.Probe+"."+earlier.Name]
				break
			}
		}
	}
	out := map[string]string{}
	for _, e := range p.estimates {
		out[e.name] = e.block
		if block, ok := first[e.block]; ok {
			out[e.name] = block
		}
	}
	return out
}

func shareFile(a, b []recipes.Data) bool {
	for _, x := range a {
		for _, y := range b {
			if x.Path != "" && x.Path == y.Path {
				return true
			}
		}
	}
	return false
}
