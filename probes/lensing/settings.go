package lensing

import (
	"fmt"

	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// The settings that methods of lensing share.
var (
	massSetting = method.Setting{
		Name: "mass", Kind: method.Number, Unit: "solMass", Low: 1e8, High: 1e18,
		Default: method.Distributed(prior.LogUniform(1e12, 1e16)),
		Doc:     "prior on M_200c",
	}
	concentrationSetting = method.Setting{
		Name: "concentration", Kind: method.Number, Low: 0.1, High: 1000,
		Relation: relationNames(), Default: method.Related("duffy-2008"),
		Doc:    "c_200c of an NFW halo; an isothermal sphere has none",
		Source: "Duffy et al. 2008, MNRAS 390, L64",
	}
	shearBiasSetting = method.Setting{
		Name: "shear_bias", Kind: method.Number, Low: -0.9, High: 10, Default: method.Exactly(0),
		Doc: "multiplicative calibration m of the shapes, g_obs = (1+m) g",
	}
	dilutionSetting = method.Setting{
		Name: "dilution", Kind: method.Number, Low: 0, High: 0.99, Default: method.Exactly(0),
		Doc: "fraction f of unsheared galaxies among the sources that their redshifts do not tell, g_obs = (1−f) g",
	}
	distanceScaleSetting = method.Setting{
		Name: "source_distance_scale", Kind: method.Number, Low: 0.1, High: 10, Default: method.Exactly(1),
		Doc: "multiplies the lensing efficiency β of every source",
	}
	elongationSetting = method.Setting{
		Name: "elongation", Kind: method.Number, Low: 0.1, High: 10, Default: method.Exactly(1),
		Doc: "multiplies the projected mass of the halo, at equal spherical mass: above 1 for a halo drawn out along the line of sight",
	}
)

func relationNames() []string {
	var names []string
	for _, r := range halo.Relations() {
		names = append(names, r.Name)
	}
	return names
}

// assumed says in words what the named settings are, leaving out those that are
// exactly at their default and so change nothing.
func assumed(t *estimate.Task, settings ...method.Setting) []string {
	var lines []string
	for _, s := range settings {
		v := t.Settings[s.Name]
		if !v.Set || v.Relation == "" && v.Nuisance == "" && v.Prior == s.Default.Prior && s.Default.Relation == "" {
			continue
		}
		line := s.Name + ": "
		if v.Relation == "" {
			line += v.Prior.String()
		} else if r, ok := halo.FindRelation(v.Relation); ok {
			line += fmt.Sprintf("relation %q (%s), scatter %.2g in ln", r.Name, r.Source, r.Scatter)
		}
		if v.Nuisance != "" {
			line += fmt.Sprintf(" (nuisance.%s)", v.Nuisance)
		}
		lines = append(lines, line)
	}
	return lines
}
