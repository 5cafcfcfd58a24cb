package assemble

import (
	"context"

	"steelyard/engine"
	"steelyard/probes/reconcile"
)

// Ask says what is wanted beyond what a recipe asks for itself.
type Ask struct {
	Levers      bool // also where no pair is strained, as long as one is above 1σ
	Sensitivity bool // how the masses change with less data
}

// Round plans the further nodes that the outcome so far calls for: estimates made
// again where a shared nuisance moves them far, then the levers of the worst
// disagreement, two rounds of each at most. The nodes are added to the plan; the
// graph of the plan is then run again. false when nothing is left to do.
func (p *Plan) Round(ctx context.Context, o Outcome, ask Ask) (more bool, err error) {
	compared := p.Recipe.Reconcile != nil && finished(o, tensionNode+p.suffix)
	if ask.Sensitivity && !p.sensed {
		p.sensed = true
		var c comparison
		if compared {
			if err := read(ctx, o, tensionNode+p.suffix, &c); err != nil {
				return false, err
			}
		}
		nodes, err := p.sensitivityNodes(ctx, o, &c)
		if err != nil {
			return false, err
		}
		p.Nodes = append(p.Nodes, nodes...)
		return true, nil
	}
	if !compared {
		return false, nil
	}
	var nodes []engine.Node
	switch {
	case p.levers == nil:
		if nodes, err = p.tiltRound(ctx, o); err != nil || len(nodes) > 0 {
			break
		}
		var c comparison
		if err := read(ctx, o, tensionNode+p.suffix, &c); err != nil {
			return false, err
		}
		above := p.limits()[0]
		if ask.Levers {
			above = 1.1 // nearer to one sigma there is nothing to bring anywhere
		}
		if p.levers, err = p.findLevers(ctx, o, &c, above); err != nil || p.levers == nil {
			return false, err
		}
		nodes, err = p.firstTrials(p.levers)
	case p.leverRounds == 1:
		nodes, err = p.secondTrials(ctx, o, p.levers)
	}
	if p.levers != nil {
		p.leverRounds++
	}
	p.Nodes = append(p.Nodes, nodes...)
	return len(nodes) > 0, err
}

func finished(o Outcome, id string) bool {
	for _, r := range o.Results() {
		if r.Node.ID == id {
			return r.State == engine.Reused || r.State == engine.Computed
		}
	}
	return false
}

// mostTilts is how often estimates are made again.
const mostTilts = 2

// tiltRound makes the estimates again under the priors of their shared nuisances
// that reconcile.Share asks for, and compares them anew.
func (p *Plan) tiltRound(ctx context.Context, o Outcome) ([]engine.Node, error) {
	if len(p.suffix) >= mostTilts*len(again) {
		return nil, nil
	}
	b, err := o.Output(ctx, sharedNode+p.suffix)
	if err != nil {
		return nil, err
	}
	var joint reconcile.Joint
	if err := joint.UnmarshalBinary(b); err != nil {
		return nil, err
	}
	if joint.Tilts == nil {
		return nil, nil
	}
	from, suffix := p.sources(), p.suffix+again
	var nodes []engine.Node
	for k, name := range p.Recipe.Reconcile.Estimates {
		settings, ok := p.tiltedSettings(name, joint.Tilts[k])
		if !ok {
			return nil, nil // a prior that cannot be tilted: what was sampled stands
		}
		if len(settings) == 0 {
			continue
		}
		n, err := p.variant(name, suffix, settings)
		if err != nil {
			return nil, err
		}
		nodes, from[name] = append(nodes, n), source{n.ID, joint.Tilts[k]}
	}
	p.suffix = suffix
	return append(nodes, p.compareNodes(from, suffix)...), nil
}

// again marks the nodes of a comparison of estimates that were made again.
const again = " again"
