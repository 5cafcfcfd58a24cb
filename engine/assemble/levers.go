package assemble

import (
	"context"
	"maps"
	"math"
	"slices"

	"steelyard/engine/weighing"
	"steelyard/probes/halo"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/prior"
	"steelyard/probes/reconcile"
)

// levers are the assumptions that are tried on the worst disagreement.
type levers struct {
	at    reconcile.At // the place, its radius the matched one
	label string       // as the recipe calls it
	worst weighing.Tension
	pulls []*pull
	chi2  map[string]float64 // of the fits as they stand
}

// pull is one assumption on trial.
type pull struct {
	assumption string // "nuisance.elongation", "xray.spectra.backward.nonthermal_fraction"
	unit       string
	lever      reconcile.Lever
	settings   map[string]string // by estimate, the setting that holds it
	slope      float64           // of ln ratio, on the lever's scale, from reweighted draws
	trials     []reconcile.Trial
	outcomes   []leverOutcome
	nodes      []string // that ran the trials
	centers    []float64
	cannot     string
}

// leverOutcome is what a trial puts out.
type leverOutcome struct {
	Sigma float64            // of the worst pair
	Pull  float64            // of the worst pair
	All   float64            // of all
	Chi2  map[string]float64 // of the fits made again
}

// findLevers finds the worst disagreement and the assumptions behind it; nil when no
// pair is far enough apart.
func (p *Plan) findLevers(ctx context.Context, o Outcome, c *comparison, above float64) (*levers, error) {
	var l *levers
	for _, t := range c.Tensions {
		if math.Abs(t.Sigma) >= above && (l == nil || math.Abs(t.Sigma) > math.Abs(l.worst.Sigma)) {
			l = &levers{worst: t, label: t.At, chi2: map[string]float64{}}
		}
	}
	if l == nil {
		return nil, nil
	}
	for _, at := range p.setup().Places {
		if at.String() == l.label {
			l.at = at
		}
	}
	if l.worst.Radii == "matched" {
		for _, at := range c.At[l.worst.A] {
			if at.At == l.label {
				l.at = reconcile.At{Radius: at.Radius}
			}
		}
	}
	draws := map[string]*infer.Draws{}
	for _, name := range p.Recipe.Reconcile.Estimates {
		b, err := o.Output(ctx, name)
		if err != nil {
			return nil, err
		}
		draws[name] = new(infer.Draws)
		if err := draws[name].UnmarshalBinary(b); err != nil {
			return nil, err
		}
		l.chi2[name] = draws[name].Quality.Chi2
	}
	for _, name := range []string{l.worst.A, l.worst.B} {
		p.addPulls(l, name, draws)
	}
	return l, nil
}

// assumes reports whether a setting is an assumption that an estimate rests on:
// not its prior on the mass, which it is there to measure, nor the shape of a halo
// that it does not have.
func assumes(setting string, settings method.Settings) bool {
	switch halo := settings["halo"].Text; setting {
	case "mass":
		return false
	case "alpha":
		return halo == "einasto"
	case "core_radius":
		return halo == "cored-isothermal"
	}
	return true
}

// addPulls lists the assumptions of one estimate of the pair. One that is shared
// is listed once, with every compared estimate that names it.
func (p *Plan) addPulls(l *levers, name string, draws map[string]*infer.Draws) {
	settings, declared := p.declared(name)
	for _, d := range declared {
		v, set := settings[d.Name]
		if d.Kind != method.Number || !set || !v.Set || !assumes(d.Name, settings) {
			continue
		}
		q := &pull{
			assumption: name + "." + d.Name, unit: v.Unit, settings: map[string]string{name: d.Name},
			lever: reconcile.Lever{Prior: v.Prior, Low: d.Low, High: d.High},
		}
		if v.Relation != "" && !q.related(v.Relation, draws[name]) {
			continue
		}
		if v.Nuisance != "" {
			q.assumption = "nuisance." + v.Nuisance
			if slices.ContainsFunc(l.pulls, func(other *pull) bool { return other.assumption == q.assumption }) {
				continue
			}
			q.settings = p.naming(v.Nuisance)
		}
		if _, drawn := q.lever.Width(); drawn && draws[name].Parameter(d.Name) == nil {
			continue // the halo the estimate has does without it
		}
		q.slope = l.slopeOf(q, draws)
		l.pulls = append(l.pulls, q)
	}
}

// related takes the concentration that a relation with mass gave as the median of
// a prior with the relation's scatter.
func (q *pull) related(relation string, d *infer.Draws) bool {
	r, known := halo.FindRelation(relation)
	column := d.Parameter("concentration")
	if !known || column == nil {
		return false
	}
	var err error
	q.lever.Prior, err = prior.LogNormal(infer.Percentiles(column.Values, 50)[0], r.Scatter)
	return err == nil
}

// naming gives the compared estimates that name a nuisance, with the setting.
func (p *Plan) naming(nuisance string) map[string]string {
	out := map[string]string{}
	for _, name := range p.Recipe.Reconcile.Estimates {
		settings, _ := p.declared(name)
		for _, setting := range slices.Sorted(maps.Keys(settings)) {
			if v := settings[setting]; v.Set && v.Nuisance == nuisance {
				out[name] = setting
			}
		}
	}
	return out
}

// slopeOf guesses how ln ratio answers to the assumption, from the draws of the
// estimates that make it; 0 when it was not drawn.
func (l *levers) slopeOf(q *pull, draws map[string]*infer.Draws) float64 {
	width, drawn := q.lever.Width()
	if !drawn {
		return 0
	}
	sum := 0.0
	for _, name := range []string{l.worst.A, l.worst.B} {
		sign := 1.0
		if name == l.worst.B {
			sign = -1
		}
		setting, ok := q.settings[name]
		if !ok {
			continue
		}
		d := draws[name]
		column := d.Parameter(setting)
		if column == nil {
			continue
		}
		scores := make([]float64, d.N)
		for i, v := range column.Values {
			scores[i] = q.lever.Prior.Score(v)
		}
		if ln, ok := l.lnMass(d); ok {
			sum += sign * reconcile.Slope(ln, scores) / width
		}
	}
	return sum
}

// lnMass is ln M of every draw at the place.
func (l *levers) lnMass(d *infer.Draws) ([]float64, bool) {
	r := l.at.Radius
	if r == 0 { // own radii: near enough for a guess
		r = math.Sqrt(d.Covers[0] * d.Covers[1])
	}
	return d.LnMassesAt(math.Log(r))
}
