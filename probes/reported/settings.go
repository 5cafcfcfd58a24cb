package reported

import (
	"steelyard/probes/cosmology"
	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// Settings are the attributes of a reported mass.
func Settings() []method.Setting {
	var vias, relations []string
	for _, r := range rules {
		vias = append(vias, r.name)
	}
	for _, r := range halo.Relations() {
		relations = append(relations, r.Name)
	}
	return []method.Setting{
		{Name: "probe", Kind: method.Choice, Required: true, Choices: []string{"xray", "lensing", "dynamics", "sz"},
			Doc: "what the mass was measured by"},
		{Name: "via", Kind: method.Choice, Choices: vias,
			Doc: "how the mass was made, which says how it moves with the cosmology; silent: hydrostatic for xray, shear for lensing, virial for dynamics, gas-mass for sz"},
		{Name: "mass", Kind: method.Measured, Unit: "solMass", Required: true, Low: 1, High: 1e18, Doc: "the published mass with its error"},
		{Name: "overdensity", Kind: method.Overdensity, Doc: "the overdensity inside whose radius the mass was quoted"},
		{Name: "radius", Kind: method.Exact, Unit: "kpc", Length: true, Low: 1e-6, High: 1e6, Doc: "the radius inside which the mass was quoted"},
		{Name: "projected", Kind: method.Flag, Default: method.Value{Set: true}, Doc: "whether the mass is that of the cylinder of that radius"},
		{Name: "concentration", Kind: method.Number, Low: 0.1, High: 100, Relation: relations, Default: method.Related("duffy-2008"),
			Doc: "c_200c, in the cosmology it was stated in, of the NFW halo along which the mass is carried", Source: "Duffy et al. 2008, MNRAS 390, L64"},
		{Name: "source_redshift", Kind: method.Exact, Low: 1e-6, High: 1100,
			Doc: "redshift of the lensed sources; silent: 1 (2 for strong-lensing), or 0.5 behind the lens where that is farther"},
		{Name: "elongation", Kind: method.Number, Default: method.Exactly(1), Low: 0.1, High: 10,
			Doc: "factor by which the halo's shape raises the projected mass; for masses from lensing"},
		{Name: "intrinsic_scatter", Kind: method.Number, Default: method.Exactly(0), Low: 0, High: 2,
			Doc: "scatter of ln M about the spherical truth beyond the quoted error"},
		{Name: "source", Kind: method.Text, Doc: "where the mass was published"},
	}
}

// published is a reported mass made ready.
type published struct {
	task           *estimate.Task
	there          *estimate.Task // the same in the cosmology the mass was stated in
	via            rule
	anchor         estimate.Anchor // in that cosmology
	definition     halo.Definition
	stretch        float64 // D_A here over D_A there
	threshold200   float64 // 200 times critical here, Msun/kpc³
	sourceRedshift float64
	assumed        string // says that the source redshift was not given
	parameters     estimate.Parameters
	elongation     estimate.Ref
	concentration  estimate.Concentration
	solved         int // column of mass_200c
}

func read(t *estimate.Task, stated *cosmology.Cosmology) (*published, error) {
	s, z := t.Settings, t.Object.Redshift
	there := *t
	if stated != nil && stated.Params() != t.Cosmology.Params() {
		there.Cosmology = stated
	}
	p := &published{
		task: t, there: &there, threshold200: 200 * t.Cosmology.CriticalDensity(z),
		stretch: t.Cosmology.AngularDiameter(z) / there.Cosmology.AngularDiameter(z),
	}
	mass := s["mass"].Prior
	if mass.IsExact() {
		return nil, t.Errorf("the mass has no error, so it cannot be compared: write `mass = \"%g +- … solMass\"`", mass.A)
	}
	if mass.A <= 0 {
		return nil, t.Errorf("a mass must be positive, not %g Msun", mass.A)
	}
	name := s["via"].Text
	if name == "" {
		name = viaOf[s["probe"].Text]
	}
	var ok bool
	if p.via, ok = findRule(name); !ok {
		return nil, t.Errorf("via %q is not known", name)
	}
	if err := p.readPlace(); err != nil {
		return nil, err
	}
	if err := p.readSources(); err != nil {
		return nil, err
	}
	if e := s["elongation"]; !p.via.projected && e.Set && !(e.Prior.IsExact() && e.Prior.A == 1) {
		return nil, t.Errorf("elongation enters a mass from lensing only, not one made via %s", name)
	}
	p.parameters.Draw("reported_mass", "solMass", mass)
	p.elongation = p.parameters.Assume(s, "elongation")
	var err error
	if p.concentration, err = p.parameters.Concentration(p.there); err != nil {
		return nil, err
	}
	p.solved = len(p.parameters.Free)
	p.column("mass_200c", "solMass")
	p.column("scale_radius", "kpc")
	if p.concentration.Related() {
		p.column("concentration", "")
	}
	return p, nil
}

// column adds a quantity that is computed from the draws; the prior given here
// only holds its place.
func (p *published) column(name, unit string) {
	p.parameters.Draw(name, unit, place)
}

// readPlace reads where the mass is: a radius, a cylinder or an overdensity.
func (p *published) readPlace() error {
	t, s := p.task, p.task.Settings
	radius, overdensity := s["radius"], s["overdensity"]
	p.anchor.Projected = s["projected"].Flag
	switch {
	case radius.Set == overdensity.Set:
		return t.Errorf("a reported mass takes either `radius` or `overdensity`")
	case radius.Set:
		p.anchor.Radius = radius.Prior.A
		if radius.Unit == "rad" {
			p.anchor.Radius *= p.there.Cosmology.AngularDiameter(t.Object.Redshift)
		}
		return nil
	case p.anchor.Projected:
		return t.Errorf("a projected mass is quoted inside a radius, not at an overdensity")
	}
	p.definition = halo.Definition{Delta: overdensity.Prior.A, Of: overdensity.Text}
	var err error
	if p.anchor.Threshold, err = p.definition.Threshold(p.there.Cosmology, t.Object.Redshift); err != nil {
		return t.Errorf("%w", err)
	}
	return nil
}

// readSources reads the redshift of the lensed sources, which matters only to
// lensing.
func (p *published) readSources() error {
	if !p.via.projected {
		return nil
	}
	t, z := p.task, p.task.Object.Redshift
	if v := t.Settings["source_redshift"]; v.Set {
		p.sourceRedshift = v.Prior.A
		if p.sourceRedshift <= z {
			return t.Errorf("source_redshift %g is not behind the object at %g", p.sourceRedshift, z)
		}
		return nil
	}
	p.sourceRedshift, p.assumed = max(1, z+0.5), " (assumed, for none is given)"
	if p.via.name == "strong-lensing" {
		p.sourceRedshift = max(2, z+0.5)
	}
	return nil
}

var place = prior.Prior{Kind: prior.NormalKind, A: 0, B: 1}
