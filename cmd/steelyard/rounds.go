package main

import (
	"context"

	"steelyard/cache"
	"steelyard/engine"
)

// outcome is what became of a plan over all its rounds: the last report, with
// what the rounds before it computed as computed.
type outcome struct {
	*engine.Report
	earlier map[string]engine.Result
}

// Results gives the outcome of every node.
func (o *outcome) Results() []engine.Result {
	results := o.Report.Results()
	for i, r := range results {
		if before, ok := o.earlier[r.Node.ID]; ok && r.State == engine.Reused {
			results[i].State, results[i].Seconds = engine.Computed, before.Seconds
		}
	}
	return results
}

// execute runs the graph of a plan, and again with the nodes that its outcome
// calls for, until it calls for none.
func (o *options) execute(ctx context.Context, store *cache.Store, p *planned, d *display) (*outcome, error) {
	out := &outcome{earlier: map[string]engine.Result{}}
	for {
		var err error
		out.Report, err = engine.Run(ctx, p.graph, store, engine.Options{
			Recipe: p.path, Workers: o.workers, Program: version(), Events: d.event,
		})
		if err != nil {
			return out, err
		}
		for _, r := range out.Report.Results() {
			if r.State == engine.Computed {
				out.earlier[r.Node.ID] = r
			}
		}
		more, err := p.plan.Round(ctx, out, o.ask)
		if err != nil || !more {
			return out, err
		}
		if p.graph, err = engine.NewGraph(p.plan.Nodes); err != nil {
			return out, err
		}
	}
}
