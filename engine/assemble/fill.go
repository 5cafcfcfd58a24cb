package assemble

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"

	"steelyard/engine"
	"steelyard/engine/weighing"
)

// Outcome is what became of the graph: what Fill reads a weighing off.
type Outcome interface {
	Results() []engine.Result
	Output(ctx context.Context, id string) ([]byte, error)
}

// Fill reads the weighing off the outputs of the graph. Estimates that failed
// are left out of it and listed among its failures.
func (p *Plan) Fill(ctx context.Context, o Outcome) (*weighing.Weighing, error) {
	w := p.header()
	done := map[string]bool{}
	for _, r := range o.Results() {
		node := weighing.Node{ID: r.Node.ID, Kind: r.Node.Kind, State: string(r.State), Seconds: r.Seconds}
		if r.State == engine.Reused || r.State == engine.Computed {
			node.Digest = r.Digest.String()
			done[r.Node.ID] = true
		}
		w.Nodes = append(w.Nodes, node)
		if r.State == engine.Failed && !p.trials[r.Node.ID] {
			w.Failures = append(w.Failures, weighing.Failure{Node: r.Node.ID, Where: r.Node.Where, Reason: reason(r.Err)})
		}
	}
	compared := comparison{}
	if tension := tensionNode + p.suffix; done[tension] {
		if err := read(ctx, o, tension, &compared); err != nil {
			return nil, err
		}
	}
	if p.levers != nil {
		p.readTrials(ctx, o, p.levers)
		w.Levers = p.levers.weigh()
	}
	w.Tensions, w.Profiles, w.Spreads = compared.Tensions, compared.Profiles, compared.Spreads
	w.Consistency, w.Combined, w.Whole, w.Warnings = compared.Consistency, compared.Combined, compared.Whole, compared.Warnings
	if err := p.sensitivities(ctx, o, w); err != nil {
		return nil, err
	}
	if len(w.Combined) > 0 {
		w.CombinedBy = p.Recipe.Reconcile.Combined
	}
	for i := range w.Consistency {
		w.Consistency[i].Given = p.given(w.Consistency[i].Of)
	}
	for _, e := range p.estimates {
		if !done[e.masses] {
			continue
		}
		var s weighing.Estimate
		if err := read(ctx, o, e.masses, &s); err != nil {
			return nil, err
		}
		s.At = compared.At[e.name]
		w.Estimates = append(w.Estimates, s)
	}
	return w, nil
}

func read(ctx context.Context, o Outcome, id string, into any) error {
	b, err := o.Output(ctx, id)
	if err != nil {
		return err
	}
	if err := json.Unmarshal(b, into); err != nil {
		return fmt.Errorf("the output of %s cannot be read: %w", id, err)
	}
	return nil
}

// reason is a node's error without the name and place that a failure states
// beside it.
func reason(err error) string {
	var node *engine.NodeError
	if errors.As(err, &node) {
		err = node.Err
	}
	return err.Error()
}
