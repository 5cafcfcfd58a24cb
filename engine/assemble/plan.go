package assemble

import (
	"fmt"

	"steelyard/engine"
	"steelyard/engine/weighing"
	"steelyard/probes/cosmology"
	"steelyard/probes/estimate"
	"steelyard/recipes"
)

// Plan is the graph that weighs one object, and what is needed to read the
// weighing off its outputs.
type Plan struct {
	Recipe *recipes.Recipe
	Nodes  []engine.Node

	background *cosmology.Cosmology
	object     estimate.Object
	estimates  []planned

	// What the rounds after the weighing have come to.
	suffix      string // of the comparison that holds
	levers      *levers
	leverRounds int
	sensed      bool            // whether less data were tried
	ranges      []string        // nodes that tell what that changes
	trials      map[string]bool // nodes that may fail: an estimate that an assumption makes impossible
}

// planned is one estimate of the plan.
type planned struct {
	name, block, probe, method string
	masses                     string // the node that summarises its draws
}

// New plans the weighing of a recipe. An error names the line of the recipe.
func New(r *recipes.Recipe) (*Plan, error) {
	background, err := universe(r.Cosmology)
	if err != nil {
		return nil, err
	}
	p := &Plan{
		Recipe: r, background: background, trials: map[string]bool{},
		object: estimate.Object{Name: r.Object.Name, Redshift: r.Object.Redshift, RA: r.Object.RA, Dec: r.Object.Dec, HasCentre: r.Object.HasCentre},
	}
	for _, b := range r.Blocks {
		if err := p.block(b); err != nil {
			return nil, err
		}
	}
	for _, m := range r.Reported {
		if err := p.reported(m); err != nil {
			return nil, err
		}
	}
	for _, e := range p.estimates {
		p.Nodes = append(p.Nodes, p.massesNode(e))
	}
	if r.Reconcile != nil {
		p.Nodes = append(p.Nodes, p.compareNodes(p.sources(), "")...)
	}
	return p, nil
}

// universe is the background a recipe states; without omega_lambda it is flat.
func universe(c recipes.Cosmology) (*cosmology.Cosmology, error) {
	q := cosmology.Params{
		HubbleConstant: c.HubbleConstant, OmegaMatter: c.OmegaMatter, OmegaLambda: c.OmegaLambda,
		W0: c.W0, Wa: c.Wa, CMBTemperature: c.CMBTemperature,
	}
	if c.Flat && c.CMBTemperature != 0 {
		q = q.Flat()
	}
	background, err := cosmology.New(q)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", place(c.Range), err)
	}
	return background, nil
}

// header is the part of a weighing that the recipe alone decides.
func (p *Plan) header() *weighing.Weighing {
	c := p.background.Params()
	w := &weighing.Weighing{
		Schema: weighing.Schema, Recipe: p.Recipe.File,
		Object:    weighing.Object{Name: p.object.Name, Redshift: p.object.Redshift},
		Cosmology: weighing.Cosmology{HubbleConstant: c.HubbleConstant, OmegaMatter: c.OmegaMatter, OmegaLambda: c.OmegaLambda},
	}
	if c.W0 != -1 || c.Wa != 0 {
		w.Cosmology.W0, w.Cosmology.Wa = &c.W0, &c.Wa
	}
	if c.CMBTemperature != 0 {
		w.Cosmology.CMBTemperature = &c.CMBTemperature
	}
	if p.Recipe.Reconcile != nil {
		w.RadiiFrom = p.Recipe.Reconcile.RadiiFrom
	}
	return w
}
