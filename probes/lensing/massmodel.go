package lensing

import (
	"fmt"
	"math"
	"slices"

	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// The settings that say what halo is fitted.
var (
	haloSetting = method.Setting{
		Name: "halo", Kind: method.Choice, Choices: []string{"nfw", "einasto", "hernquist", "isothermal", "cored-isothermal"},
		Default: method.Word("nfw"), Doc: "the mass model",
	}
	massSetting = method.Setting{
		Name: "mass", Kind: method.Number, Unit: "solMass", Low: 1e8, High: 1e18,
		Default: method.Distributed(prior.LogUniform(1e12, 1e16)),
		Doc:     "prior on M_200c",
	}
	concentrationSetting = method.Setting{
		Name: "concentration", Kind: method.Number, Low: 0.1, High: 1000,
		Relation: relationNames(), Default: method.Related("duffy-2008"),
		Doc:    "c_200c = r_200c/r₋₂ of an NFW, Einasto or Hernquist halo, r₋₂ being where its density falls as r⁻²; isothermal spheres have none",
		Source: "Duffy et al. 2008, MNRAS 390, L64",
	}
	alphaSetting = method.Setting{
		Name: "alpha", Kind: method.Number, Low: 0.02, High: 2, Default: method.Exactly(0.18),
		Doc:    "index of an Einasto halo; drawing it makes the fit slow",
		Source: "Gao et al. 2008, MNRAS 387, 536 (for haloes of clusters; from memory)",
	}
	coreSetting = method.Setting{
		Name: "core_radius", Kind: method.Number, Unit: "kpc", Length: true, Low: 0.01, High: 1e4,
		Default: method.Distributed(prior.LogUniform(1, 300)),
		Doc:     "core radius of a cored isothermal sphere",
	}
	haloSettings = []method.Setting{haloSetting, massSetting, concentrationSetting, alphaSetting, coreSetting}
)

func relationNames() []string {
	var names []string
	for _, r := range halo.Relations() {
		names = append(names, r.Name)
	}
	return names
}

// uses names, by halo, the settings of its shape.
var uses = map[string][]string{
	"nfw":              {"concentration"},
	"hernquist":        {"concentration"},
	"einasto":          {"concentration", "alpha"},
	"cored-isothermal": {"core_radius"},
}

// massModel is the spherical halo that an estimate fits, as a function of what
// it draws.
type massModel struct {
	kind          string
	threshold     float64 // mean density inside r_200c, Msun/kpc³
	mass          estimate.Ref
	concentration estimate.Concentration
	alpha         estimate.Ref
	core          estimate.Ref
	drawn         int  // how many parameters of the halo are drawn
	shaped        bool // whether the concentration is among them
	einasto       *projection
}

// newMassModel adds the parameters of the halo that the task's settings name.
func newMassModel(t *estimate.Task, ps *estimate.Parameters) (*massModel, error) {
	threshold, err := halo.Definition{Delta: 200, Of: "critical"}.Threshold(t.Cosmology, t.Object.Redshift)
	if err != nil {
		return nil, t.Errorf("%w", err)
	}
	m := &massModel{kind: t.Settings["halo"].Text, threshold: threshold}
	before := len(ps.Free)
	m.mass = ps.Assume(method.Settings{"mass_200c": t.Settings["mass"]}, "mass_200c")
	switch m.kind {
	case "nfw", "hernquist", "einasto":
		first := len(ps.Free)
		if m.concentration, err = ps.Concentration(t); err != nil {
			return nil, err
		}
		m.shaped = len(ps.Free) > first
		if m.kind == "einasto" {
			m.alpha = ps.Assume(t.Settings, "alpha")
			if !m.alpha.Drawn() {
				m.einasto = newProjection(halo.Einasto{RhoS: 1, Rs: 1, Alpha: m.alpha.Of(nil)})
			}
		}
	case "cored-isothermal":
		m.core = ps.Assume(t.Settings, "core_radius")
	case "isothermal":
	default:
		return nil, t.Errorf("the halo %q is not known", m.kind)
	}
	m.drawn = len(ps.Free) - before
	return m, nil
}

// at is the halo at theta; not ok where there is none.
func (m *massModel) at(theta []float64) (h halo.Model, ok bool) {
	mass := m.mass.Of(theta)
	if !(mass > 0) {
		return nil, false
	}
	switch m.kind {
	case "isothermal":
		return halo.NewIsothermal(mass, m.threshold), true
	case "cored-isothermal":
		core := m.core.Of(theta)
		return halo.NewCoredIsothermal(mass, core, m.threshold), core > 0
	}
	c := m.concentration.Of(theta, mass)
	if !(c > 0) || m.kind == "einasto" && !(m.alpha.Of(theta) > 0) {
		return nil, false
	}
	return m.with(mass, c, theta), true
}

// with is the halo of a mass and a concentration, otherwise as at theta.
func (m *massModel) with(mass, c float64, theta []float64) halo.Model {
	switch m.kind {
	case "hernquist":
		return halo.NewHernquist(mass, c, m.threshold)
	case "einasto":
		h := halo.NewEinasto(mass, c, m.alpha.Of(theta), m.threshold)
		if m.einasto != nil {
			return projected{h, m.einasto, h.Rs, h.RhoS * h.Rs}
		}
		return h
	}
	return halo.NewNFW(mass, c, m.threshold)
}

// lnMass fills out with ln M(<r) at theta.
func (m *massModel) lnMass(theta, radii, out []float64) error {
	h, ok := m.at(theta)
	if !ok {
		return fmt.Errorf("lensing: a draw without a halo")
	}
	for i, r := range radii {
		out[i] = math.Log(h.Mass(r))
	}
	return nil
}

// derived lists what is reported of the halo beyond what is drawn.
func (m *massModel) derived() []estimate.Derived {
	var out []estimate.Derived
	if !m.mass.Drawn() {
		out = append(out, estimate.Derived{Name: "mass_200c", Unit: "solMass", Of: m.mass.Of})
	}
	switch m.kind {
	case "isothermal", "cored-isothermal":
		return append(out, estimate.Derived{Name: "dispersion", Unit: "km/s", Of: func(theta []float64) float64 {
			switch h, _ := m.at(theta); h := h.(type) {
			case halo.CoredIsothermal:
				return h.Sigma
			case halo.Isothermal:
				return h.Sigma
			}
			panic("lensing: an isothermal sphere of another kind")
		}})
	}
	if m.concentration.Related() {
		out = append(out, estimate.Derived{Name: "concentration", Of: func(theta []float64) float64 {
			return m.concentration.Of(theta, m.mass.Of(theta))
		}})
	}
	return out
}

// assumes says in words what halo it is.
func (m *massModel) assumes(t *estimate.Task) []string {
	name := map[string]string{
		"nfw": "NFW", "einasto": "Einasto", "hernquist": "Hernquist",
		"isothermal": "singular isothermal sphere", "cored-isothermal": "isothermal sphere with a core",
	}[m.kind]
	lines := []string{fmt.Sprintf("halo: %s, with an infinite line of sight", name)}
	for _, s := range []method.Setting{concentrationSetting, alphaSetting, coreSetting} {
		v, byDefault := t.Settings[s.Name], s.Default
		switch {
		case slices.Contains(uses[m.kind], s.Name):
			lines = append(lines, stated(t, s))
		case v.Nuisance != "" || v.Relation != byDefault.Relation || v.Prior != byDefault.Prior:
			lines = append(lines, fmt.Sprintf("%s: not used, this halo has none", s.Name))
		}
	}
	return lines
}
