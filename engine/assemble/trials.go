package assemble

import (
	"context"
	"encoding/json"
	"fmt"
	"maps"
	"math"
	"slices"

	"steelyard/engine"
	"steelyard/engine/weighing"
	"steelyard/probes/method"
	"steelyard/probes/reconcile"
)

// trial plans the estimates with an assumption moved and their comparison.
func (p *Plan) trial(l *levers, q *pull, center float64) ([]engine.Node, error) {
	moved, err := q.lever.Moved(center)
	if err != nil {
		return nil, err
	}
	suffix := fmt.Sprintf(" with %s = %.6g", q.assumption, center)
	from := p.sources()
	var nodes []engine.Node
	for _, name := range p.Recipe.Reconcile.Estimates {
		setting, ok := q.settings[name]
		if !ok {
			continue
		}
		settings, _ := p.declared(name)
		v := settings[setting]
		n, err := p.variant(name, suffix, method.Settings{setting: {Set: true, Prior: moved, Nuisance: v.Nuisance, Unit: v.Unit}})
		if err != nil {
			return nil, err
		}
		nodes, from[name] = append(nodes, n), source{node: n.ID}
	}
	n := p.leverNode(l, from, "levers"+suffix)
	q.centers, q.nodes = append(q.centers, center), append(q.nodes, n.ID)
	nodes = append(nodes, n)
	for _, n := range nodes {
		p.trials[n.ID] = true
	}
	return nodes, nil
}

// leverNode compares once more, at the one place.
func (p *Plan) leverNode(l *levers, from map[string]source, id string) engine.Node {
	c := p.Recipe.Reconcile
	setup := p.setup()
	setup.Places, setup.Own = []reconcile.At{l.at}, nil
	n := engine.Node{ID: id, Kind: "reconcile/lever", Version: reconcile.Version, Where: place(c.Range)}
	n.Params = append(p.backgroundFacts(), fmt.Sprintf("seed = %d", p.Recipe.Sampling.Seed), fmt.Sprintf("pair = %q %q", l.worst.A, l.worst.B))
	n.Params = append(n.Params, setupFacts(setup)...)
	for _, name := range c.Estimates {
		n.Inputs = append(n.Inputs, from[name].node)
		n.Params = append(n.Params, fmt.Sprintf("estimate = %q", name))
	}
	n.Run = func(ctx context.Context, job engine.Job) (engine.Output, error) {
		s := setup
		var err error
		if s.Estimates, err = p.compared(job, from); err != nil {
			return engine.Output{}, err
		}
		stream := p.sampling(&n, job).Stream
		joint, err := reconcile.Share(ctx, s.Estimates, stream)
		if err != nil {
			return engine.Output{}, err
		}
		m, err := reconcile.MatchAll(s, joint, stream)
		if err != nil {
			return engine.Output{}, err
		}
		r, err := reconcile.Compare(m, p.limits(), stream)
		if err != nil {
			return engine.Output{}, err
		}
		out := leverOutcome{Chi2: map[string]float64{}}
		for _, t := range r.Tensions {
			if t.A == l.worst.A && t.B == l.worst.B {
				out.Sigma, out.Pull = t.Sigma, pullOf(weighing.Interval(t.Ratio))
			}
		}
		if len(r.Consistency) > 0 {
			out.All = r.Consistency[0].Sigma
		}
		for _, e := range s.Estimates {
			out.Chi2[e.Name] = e.Draws.Quality.Chi2
		}
		b, err := json.Marshal(out)
		return engine.Output{Bytes: b}, err
	}
	return n
}

// pullOf is ln ratio over half its 68% interval.
func pullOf(ratio weighing.Interval) float64 {
	return 2 * math.Log(ratio.Median) / math.Log(ratio.Hi/ratio.Lo)
}

// firstTrials plans the first trial of every lever.
func (p *Plan) firstTrials(l *levers) ([]engine.Node, error) {
	var nodes []engine.Node
	// ln ratio has to come towards zero by all but one standard deviation.
	ln := math.Log(l.worst.Ratio.Median)
	needed := -ln * (1 - 1/math.Abs(l.worst.Sigma))
	for _, q := range l.pulls {
		q.trials = []reconcile.Trial{{Center: q.lever.Center(), Sigma: math.Abs(l.worst.Sigma), Pull: math.Abs(pullOf(l.worst.Ratio))}}
		var center float64
		if center, q.cannot = q.lever.First(needed, q.slope); q.cannot != "" {
			continue
		}
		more, err := p.trial(l, q, center)
		if err != nil {
			return nil, err
		}
		nodes = append(nodes, more...)
	}
	return nodes, nil
}

// secondTrials reads the first trials and plans the second of those that need
// one.
func (p *Plan) secondTrials(ctx context.Context, o Outcome, l *levers) ([]engine.Node, error) {
	p.readTrials(ctx, o, l)
	var nodes []engine.Node
	for _, q := range l.pulls {
		if q.cannot != "" || len(q.trials) < 2 || q.trials[1].Reached() {
			continue
		}
		var center float64
		if center, q.cannot = q.lever.Next(q.trials); q.cannot != "" {
			continue
		}
		more, err := p.trial(l, q, center)
		if err != nil {
			return nil, err
		}
		nodes = append(nodes, more...)
	}
	return nodes, nil
}

// readTrials reads the outcomes of trials that were run since. An estimate that
// cannot be made with an assumption moved says that it cannot be moved there.
func (p *Plan) readTrials(ctx context.Context, o Outcome, l *levers) {
	sign := math.Copysign(1, l.worst.Sigma)
	for _, q := range l.pulls {
		for i := len(q.outcomes); i < len(q.nodes); i++ {
			var out leverOutcome
			if err := read(ctx, o, q.nodes[i], &out); err != nil {
				q.cannot = fmt.Sprintf("the estimate cannot be made with it at %.3g", q.centers[i])
				break
			}
			q.outcomes = append(q.outcomes, out)
			q.trials = append(q.trials, reconcile.Trial{Center: q.centers[i], Sigma: sign * out.Sigma, Pull: sign * out.Pull})
		}
	}
}

// weigh turns the trials into what is printed, the most plausible first: those
// moved least within their priors, counting what the fit pays as well; then the
// exact numbers by what the fit pays; then those that cannot do it.
func (l *levers) weigh() []weighing.Lever {
	var out []weighing.Lever
	rank := map[string]float64{}
	for _, q := range l.pulls {
		v := weighing.Lever{At: l.label, A: l.worst.A, B: l.worst.B, Assumption: q.assumption, Unit: q.unit, Present: q.lever.Center(), Cannot: q.cannot}
		if q.cannot == "" && len(q.outcomes) > 0 {
			best := reconcile.Nearest(q.trials[1:])
			found := q.outcomes[best]
			center := q.trials[best+1].Center
			if !q.trials[best+1].Reached() {
				if further, cannot := q.lever.Next(q.trials); cannot == "" {
					center, v.Interpolated = further, true
				} else {
					v.Cannot = cannot
				}
			}
			if v.Cannot == "" {
				v.Value = &center
				v.Sigma, v.All = &q.trials[best+1].Sigma, &found.All
				change := 0.0
				for _, name := range slices.Sorted(maps.Keys(q.settings)) {
					change += found.Chi2[name] - l.chi2[name]
				}
				v.Chi2 = &change
				if sd, ok := q.lever.InPriorSD(center); ok {
					v.InPriorSD = &sd
					rank[q.assumption] = sd*sd + max(change, 0)
				} else {
					rank[q.assumption] = 1e6 + max(change, 0)
				}
			}
		}
		if v.Value == nil {
			rank[q.assumption] = 1e12
		}
		out = append(out, v)
	}
	slices.SortStableFunc(out, func(a, b weighing.Lever) int {
		switch x, y := rank[a.Assumption], rank[b.Assumption]; {
		case x < y:
			return -1
		case x > y:
			return 1
		}
		return 0
	})
	return out
}
