package assemble

import (
	"math"

	"steelyard/probes/method"
	"steelyard/probes/prior"
	"steelyard/probes/reconcile"
)

// tiltedSettings are the settings of an estimate under tilted priors of what it
// shares. A normal law in the prior's scores is a prior of the same family for a
// normal and a lognormal one; false for any other.
func (p *Plan) tiltedSettings(name string, tilts []reconcile.Tilt) (method.Settings, bool) {
	settings, _ := p.declared(name)
	out := method.Settings{}
	for _, t := range tilts {
		for setting, v := range settings {
			if !v.Set || v.Nuisance != t.Nuisance {
				continue
			}
			q := v.Prior
			switch q.Kind {
			case prior.NormalKind:
				q.A, q.B = q.A+q.B*t.Mean, q.B*t.SD
			case prior.LogNormalKind:
				q.A, q.B = q.A*math.Exp(q.B*t.Mean), q.B*t.SD
			default:
				return nil, false
			}
			v.Prior = q
			out[setting] = v
		}
	}
	return out, true
}
