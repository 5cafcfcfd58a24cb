package estimate

import (
	"math"

	"steelyard/probes/halo"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// Parameters collects what an estimate draws, in order. An assumption given as
// an exact number is not drawn; its Ref then yields the number.
type Parameters struct {
	Free     []infer.Free
	nuisance []string // for each of Free, the shared nuisance it is, or ""
	hidden   []bool   // for each of Free, whether it is left out of the output
}

// Ref reads one assumption out of a point in parameter space.
type Ref struct {
	index int // into theta; -1 for an exact number
	exact float64
}

// Of returns the assumption's value at theta, the values of Parameters.Free.
func (r Ref) Of(theta []float64) float64 {
	if r.index < 0 {
		return r.exact
	}
	return theta[r.index]
}

// Drawn reports whether the assumption is drawn rather than exact.
func (r Ref) Drawn() bool { return r.index >= 0 }

// Fixed returns a Ref to an exact number.
func Fixed(x float64) Ref { return Ref{index: -1, exact: x} }

// Draw adds a parameter with the prior; an exact prior adds nothing.
func (p *Parameters) Draw(name, unit string, pr prior.Prior) Ref {
	return p.add(name, method.Value{Set: true, Prior: pr, Unit: unit}, false)
}

// Assume adds the named setting. The setting must be set: a method whose
// settings may be silent asks Settings first.
func (p *Parameters) Assume(s method.Settings, name string) Ref {
	return p.add(name, s[name], false)
}

func (p *Parameters) add(name string, v method.Value, hidden bool) Ref {
	if v.Prior.IsExact() {
		return Fixed(v.Prior.A)
	}
	p.Free = append(p.Free, infer.Free{Name: name, Unit: v.Unit, Prior: v.Prior})
	p.nuisance = append(p.nuisance, v.Nuisance)
	p.hidden = append(p.hidden, hidden)
	return Ref{index: len(p.Free) - 1}
}

// Concentration gives c_200c, drawn itself or scattered about a published
// relation with mass.
type Concentration struct {
	direct   Ref // when relation is nil
	relation func(m200 float64) float64
	offset   Ref // of ln c about the relation
}

// Concentration adds the setting `concentration` of the task: a number, a
// prior, a shared nuisance, or relation("…") with its scatter in ln c.
func (p *Parameters) Concentration(t *Task) (Concentration, error) {
	v := t.Settings["concentration"]
	if v.Relation == "" {
		return Concentration{direct: p.add("concentration", v, false)}, nil
	}
	rel, ok := halo.FindRelation(v.Relation)
	if !ok {
		return Concentration{}, t.Errorf("the concentration–mass relation %q is not known", v.Relation)
	}
	scatter, err := prior.Normal(0, rel.Scatter)
	if err != nil {
		return Concentration{}, t.Errorf("relation %q: %v", rel.Name, err)
	}
	return Concentration{
		relation: func(m200 float64) float64 { return rel.Concentration(m200, t.Object.Redshift, t.Cosmology) },
		offset:   p.add("concentration", method.Value{Set: true, Prior: scatter}, true),
	}, nil
}

// Of returns the concentration at theta of a halo of M_200c = m200 Msun.
func (c Concentration) Of(theta []float64, m200 float64) float64 {
	if c.relation == nil {
		return c.direct.Of(theta)
	}
	return c.relation(m200) * math.Exp(c.offset.Of(theta))
}

// Related reports whether the concentration follows a relation with mass, in
// which case it is not a parameter of its own and is reported as derived.
func (c Concentration) Related() bool { return c.relation != nil }

// DrawPriors draws every parameter from its prior, independently: the whole
// posterior of an estimate whose data are a quoted number.
func (p *Parameters) DrawPriors(o infer.Options) *infer.Sample {
	n := o.Draws
	if n == 0 {
		n = 4000
	}
	s := &infer.Sample{Values: make([][]float64, n)}
	rng := o.Stream.Sub("priors").Rand(0)
	for i := range s.Values {
		theta := make([]float64, len(p.Free))
		for j, f := range p.Free {
			theta[j] = f.Prior.FromScore(rng.NormFloat64())
		}
		s.Values[i] = theta
	}
	s.Quality = infer.Quality{Converged: true, Sampler: "direct", EffectiveDraws: float64(n), Modes: 1}
	return s
}
