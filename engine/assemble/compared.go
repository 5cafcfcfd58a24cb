package assemble

import (
	"steelyard/engine/weighing"
	"steelyard/probes/reconcile"
)

// comparison is what the tension node puts out: the part of a weighing that
// concerns several estimates.
type comparison struct {
	At          map[string][]weighing.At // by estimate
	Tensions    []weighing.Tension
	Profiles    []weighing.Profile
	Spreads     []weighing.Spread
	Consistency []weighing.Consistency
	Combined    []weighing.Combined
	Whole       *weighing.Whole
	Warnings    []string
}

func compared(m *reconcile.Matching, r *reconcile.Result, b reconcile.Background) (*comparison, error) {
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
			Sigma: t.Sigma, Tail: t.Tail, PValue: t.P, PFamily: t.PFamily, RadiusLn: t.RadiusLn, Doubtful: t.Doubtful,
		})
	}
	for _, t := range r.Profiles {
		c.Profiles = append(c.Profiles, weighing.Profile{A: t.A, B: t.B, At: t.At, Kept: t.Kept, Sigma: t.Sigma, Tail: t.Tail, PValue: t.P})
	}
	for _, s := range r.Spreads {
		c.Spreads = append(c.Spreads, weighing.Spread(s))
	}
	for _, k := range r.Consistency {
		c.Consistency = append(c.Consistency, consistency(k))
	}
	for _, k := range r.Combined {
		c.Combined = append(c.Combined, combined(k))
	}
	for _, profile := range m.Combined {
		own, err := ownMasses(profile.Own, b)
		if err != nil {
			return nil, err
		}
		if profile.Scattered {
			c.Whole.Scattered = own
		} else {
			c.Whole = &weighing.Whole{Own: own}
		}
	}
	return c, nil
}

func consistency(k reconcile.Consistency) weighing.Consistency {
	c := weighing.Consistency{
		At: k.At, Chi2: k.Chi2, Dof: k.Dof, PValue: k.P, Sigma: k.Sigma, Tail: k.Tail, Verdict: k.Verdict, Of: k.Of,
		Evidence: &weighing.Evidence{LnBayes: k.LnBayes, Prior: reconcile.SeparatePrior}, Doubtful: k.Doubtful,
	}
	if k.Without != nil {
		c.Without = named(k.Of, k.Without)
	}
	return c
}

func combined(k reconcile.Combined) weighing.Combined {
	c := weighing.Combined{At: k.At, Mass: weighing.Interval(k.Linear.Mass), Weights: named(k.Of, k.Linear.Weights)}
	if s := k.Scatter; s != nil {
		c.ScatterLn = s.ScatterLn
		c.Scattered = &weighing.Scattered{Mass: weighing.Interval(s.Mass), Weights: named(k.Of, s.Weights)}
	}
	return c
}

func named(names []string, values []float64) map[string]float64 {
	out := map[string]float64{}
	for i, n := range names {
		out[n] = values[i]
	}
	return out
}

// ownMasses puts a number to the virial overdensity.
func ownMasses(own []reconcile.OwnMass, b reconcile.Background) ([]weighing.Own, error) {
	var out []weighing.Own
	for _, m := range own {
		delta := m.Definition.Delta
		if m.Definition.Of == "virial" {
			var err error
			if delta, err = b.Cosmology.VirialOverdensity(b.Redshift); err != nil {
				return nil, err
			}
		}
		out = append(out, weighing.Own{
			Overdensity: delta, Of: m.Definition.Of, Radius: weighing.Interval(m.Radius), Mass: weighing.Interval(m.Mass), Extrapolated: m.Extrapolated,
		})
	}
	return out, nil
}
