package dynamics

import (
	"math"

	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

var (
	haloSetting = method.Setting{
		Name: "halo", Kind: method.Choice, Choices: []string{"nfw", "einasto", "hernquist", "isothermal", "cored-isothermal"},
		Default: method.Word("nfw"), Doc: "the mass model",
		Source: "Navarro, Frenk & White 1997, ApJ 490, 493; Einasto 1965; Hernquist 1990, ApJ 356, 359",
	}
	alphaSetting = method.Setting{
		Name: "alpha", Kind: method.Number, Low: 0.02, High: 2, Default: method.Exactly(0.18),
		Doc: "index of an Einasto halo", Source: "Gao et al. 2008, MNRAS 387, 536 (for haloes of clusters; from memory)",
	}
	coreSetting = method.Setting{
		Name: "core_radius", Kind: method.Number, Unit: "kpc", Length: true, Low: 0.01, High: 1e4,
		Default: method.Distributed(prior.LogUniform(1, 300)), Doc: "core radius of a cored isothermal sphere",
	}
)

// massModel is the spherical halo that is fitted, as a function of what is drawn.
type massModel struct {
	kind          string
	threshold     float64 // 200 times the critical density, Msun/kpc³
	mass          estimate.Ref
	concentration estimate.Concentration
	alpha, core   estimate.Ref
}

// newMassModel adds the parameters of the halo that the settings name.
func newMassModel(t *estimate.Task, p *estimate.Parameters) (*massModel, error) {
	m := &massModel{kind: t.Settings["halo"].Text, threshold: 200 * t.Cosmology.CriticalDensity(t.Object.Redshift)}
	m.mass = p.Assume(method.Settings{"mass_200c": t.Settings["mass"]}, "mass_200c")
	var err error
	switch m.kind {
	case "nfw", "hernquist", "einasto":
		m.concentration, err = p.Concentration(t)
		if m.kind == "einasto" {
			m.alpha = p.Assume(t.Settings, "alpha")
		}
	case "cored-isothermal":
		m.core = p.Assume(t.Settings, "core_radius")
	case "isothermal":
	default:
		return nil, t.Errorf("the halo %q is not known", m.kind)
	}
	return m, err
}

// at returns the halo at theta and its r_200 and r₋₂ in kpc; r₋₂ is r_200 for
// the isothermal spheres, which have none. Not ok where there is no such halo.
func (m *massModel) at(theta []float64) (h halo.Model, r200, inner float64, ok bool) {
	mass := m.mass.Of(theta)
	if !(mass > 0) {
		return nil, 0, 0, false
	}
	r200 = math.Cbrt(mass / (4 * math.Pi / 3 * m.threshold))
	switch m.kind {
	case "isothermal":
		return halo.NewIsothermal(mass, m.threshold), r200, r200, true
	case "cored-isothermal":
		core := m.core.Of(theta)
		return halo.NewCoredIsothermal(mass, core, m.threshold), r200, r200, core > 0
	}
	c := m.concentration.Of(theta, mass)
	if !(c > 0) {
		return nil, 0, 0, false
	}
	switch m.kind {
	case "hernquist":
		return halo.NewHernquist(mass, c, m.threshold), r200, r200 / c, true
	case "einasto":
		alpha := m.alpha.Of(theta)
		if !(alpha > 0) {
			return nil, 0, 0, false
		}
		return halo.NewEinasto(mass, c, alpha, m.threshold), r200, r200 / c, true
	}
	return halo.NewNFW(mass, c, m.threshold), r200, r200 / c, true
}

func (m *massModel) lnMass(theta, radii, out []float64) error {
	h, _, _, _ := m.at(theta) // it exists: its likelihood was finite
	for j, r := range radii {
		out[j] = math.Log(h.Mass(r))
	}
	return nil
}

// derived reports the concentration where it follows a relation and is not drawn
// itself.
func (m *massModel) derived() []estimate.Derived {
	if !m.concentration.Related() {
		return nil
	}
	return []estimate.Derived{{Name: "concentration", Of: func(theta []float64) float64 {
		return m.concentration.Of(theta, m.mass.Of(theta))
	}}}
}
