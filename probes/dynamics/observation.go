package dynamics

import (
	"context"
	"fmt"
	"maps"
	"math"

	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// observation is a dispersion with its error as draws, from galaxies or quoted,
// and what stands beside it.
type observation struct {
	sigma  []float64 // draws, km/s
	linear []float64 // as in resamples
	// los is the mean line-of-sight variance where the galaxies lie, of an
	// isotropic NFW halo in its own units, over ln of its scale radius in kpc.
	// Nil where nothing is known of the aperture.
	los      func(lnRs float64) float64
	assumes  []string
	checks   []infer.Check
	warnings []string
	sample   *sample // nil for a quoted dispersion
}

// observe measures the dispersion of the members, or takes the quoted one.
func observe(ctx context.Context, t *estimate.Task) (*observation, error) {
	if _, ok := t.Reduced["members"]; ok {
		s, err := readSample(t)
		if err != nil {
			return nil, err
		}
		return s.observe(ctx, t, nil)
	}
	q, err := readQuoted(t)
	if err != nil {
		return nil, err
	}
	o := &observation{sigma: make([]float64, draws(t)), assumes: q.notes}
	if q.within > 0 {
		lnWithin := math.Log(q.within)
		o.los = func(lnRs float64) float64 { return apertureTable().at(lnWithin - lnRs) }
	}
	return o, q.draws(t, o.sigma)
}

func draws(t *estimate.Task) int {
	if t.Sampling.Draws == 0 {
		return 4000
	}
	return t.Sampling.Draws
}

func (s *sample) observe(ctx context.Context, t *estimate.Task, psi []float64) (*observation, error) {
	r, err := s.bootstrap(ctx, t, draws(t), psi)
	if err != nil {
		return nil, err
	}
	checks, warnings, err := s.checks(ctx, t)
	if err != nil {
		return nil, err
	}
	return &observation{
		sigma: r.sigma, linear: r.linear, los: s.lineOfSight(), assumes: s.describe(), sample: s,
		checks: checks, warnings: append(s.remarks(r), warnings...),
	}, nil
}

// lineOfSight tabulates the mean line-of-sight variance at the members' radii
// over scale radii from 3 kpc to 30 Mpc. The galaxies count as they were
// observed: however incomplete they are, the dispersion is theirs.
func (s *sample) lineOfSight() func(lnRs float64) float64 {
	lnRadii := make([]float64, len(s.galaxies))
	for i, g := range s.galaxies {
		lnRadii[i] = math.Log(g.Radius)
	}
	los := losTable()
	t := tabulate(math.Log(3), math.Log(3e4), 0.1, func(rs float64) float64 {
		lnRs, sum := math.Log(rs), 0.0
		for _, ln := range lnRadii {
			sum += los.at(ln - lnRs)
		}
		return sum / float64(len(lnRadii))
	})
	return t.at
}

// apertureFactor is what the observed dispersion is multiplied by to be that of
// the sphere of r_200, for an isotropic NFW halo of scale radius rs in kpc and
// concentration c = r_200/rs.
func apertureFactor(los func(lnRs float64) float64, rs, c float64) float64 {
	if los == nil {
		return 1
	}
	return math.Sqrt(sphereTable().at(math.Log(c)) / los(math.Log(rs)))
}

// assumptions are what every method draws beside the dispersion, and the halo it
// arrives at for each draw.
type assumptions struct {
	parameters    estimate.Parameters
	threshold     float64 // 200 times the critical density, Msun/kpc³
	dispersion    estimate.Ref
	bias          estimate.Ref
	elongation    estimate.Ref
	concentration estimate.Concentration
	solved        int // column of M_200c; c_200c follows it
}

// assume names the parameters of a method; the dispersion comes first.
func assume(t *estimate.Task, o *observation) (*assumptions, error) {
	a := &assumptions{threshold: 200 * t.Cosmology.CriticalDensity(t.Object.Redshift)}
	a.dispersion = a.column("dispersion", "km/s")
	a.bias = a.parameters.Assume(t.Settings, "velocity_bias")
	a.elongation = a.parameters.Assume(t.Settings, "elongation")
	var err error
	a.concentration, err = a.parameters.Concentration(t)
	return a, err
}

// column adds a quantity whose draws are computed and not drawn from a prior;
// the prior given here only holds its place.
func (a *assumptions) column(name, unit string) estimate.Ref {
	return a.parameters.Draw(name, unit, prior.Prior{Kind: prior.NormalKind, A: 0, B: 1})
}

// draw draws the assumptions from their priors, for a dispersion alone says
// nothing about them, joins them with the draws of the dispersion, solves for
// the halo of each, whose mass is 0 where there is none, and applies the prior on
// the mass.
func (a *assumptions) draw(t *estimate.Task, o *observation, solve func(i int, theta []float64) (m200, c float64)) (*infer.Sample, error) {
	a.solved = len(a.parameters.Free)
	a.column("mass_200c", "solMass")
	if a.concentration.Related() {
		a.column("concentration", "")
	}
	sample := a.parameters.DrawPriors(t.Sampling)
	masses := make([]float64, len(sample.Values))
	for i, theta := range sample.Values {
		theta[0] = o.sigma[i]
		if b := a.bias.Of(theta); !(b > 0) {
			return nil, t.Errorf("velocity_bias must be positive; its prior reaches %.3g", b)
		}
		if e := a.elongation.Of(theta); !(e > 0) {
			return nil, t.Errorf("elongation must be positive; its prior reaches %.3g", e)
		}
		if c := a.concentration.Of(theta, 1e14); !(c > 0) {
			return nil, t.Errorf("concentration must be positive; its prior reaches %.3g", c)
		}
		m200, c := solve(i, theta)
		theta[a.solved], masses[i] = m200, m200
		if a.concentration.Related() {
			theta[a.solved+1] = c
		}
	}
	return sample, underMassPrior(t, sample, masses)
}

// halo returns the halo that was solved for.
func (a *assumptions) halo(theta []float64) halo.NFW {
	m200 := theta[a.solved]
	return halo.NewNFW(m200, a.concentration.Of(theta, m200), a.threshold)
}

// lnMass is the mass profile of the halo that was solved for.
func (a *assumptions) lnMass(theta, radii, out []float64) error {
	h := a.halo(theta)
	for j, r := range radii {
		out[j] = math.Log(h.Mass(r))
	}
	return nil
}

// through returns M_200c and c_200c of the NFW halo with the given mass inside
// the radius, zeros when there is none.
func (a *assumptions) through(t *estimate.Task, mass, radius float64, theta []float64) (m200, c float64) {
	h, err := t.Carry(mass, estimate.Anchor{Radius: radius}, a.concentration, theta)
	if err != nil {
		return 0, 0
	}
	r200, err := halo.RadiusAt(h, a.threshold)
	if err != nil {
		return 0, 0
	}
	return 4 * math.Pi / 3 * a.threshold * r200 * r200 * r200, r200 / h.Rs
}

// radius200 is r_200 in kpc.
func (a *assumptions) radius200(m200 float64) float64 {
	return math.Cbrt(m200 / (4 * math.Pi / 3 * a.threshold))
}

func (a *assumptions) concentrationLine(t *estimate.Task) string {
	v := t.Settings["concentration"]
	switch {
	case v.Relation != "":
		return fmt.Sprintf("carried to other radii along an NFW halo with the concentration of %s and its scatter", v.Relation)
	case v.Nuisance != "":
		return fmt.Sprintf("carried to other radii along an NFW halo with concentration nuisance.%s", v.Nuisance)
	default:
		return fmt.Sprintf("carried to other radii along an NFW halo with concentration %s", v.Prior)
	}
}

// withScatter returns a task whose intrinsic scatter is set, to the default
// where the recipe is silent, and says in words which.
func withScatter(t *estimate.Task, width float64, source string) (*estimate.Task, string) {
	if v := t.Settings["intrinsic_scatter"]; v.Set {
		return t, fmt.Sprintf("intrinsic scatter of ln M: %s", v.Prior)
	}
	return withSetting(t, "intrinsic_scatter", method.Exactly(width)), fmt.Sprintf("intrinsic scatter of ln M: %.3f (%s)", width, source)
}

// withSetting returns the task with one setting replaced.
func withSetting(t *estimate.Task, name string, v method.Value) *estimate.Task {
	set := *t
	set.Settings = maps.Clone(t.Settings)
	set.Settings[name] = v
	return &set
}
