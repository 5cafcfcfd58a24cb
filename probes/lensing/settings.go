package lensing

import (
	"fmt"

	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/method"
)

// The assumptions that methods of lensing share.
var (
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
	miscentringSetting = method.Setting{
		Name: "miscentring", Kind: method.Number, Unit: "kpc", Length: true, Low: 0, High: 1e4, Default: method.Exactly(0),
		Doc: "distance on the sky between the centre of the bins and that of the halo. A number is the scale of the Rayleigh distribution " +
			"that the distance is drawn from; a prior is that of the distance itself",
		Source: "Johnston et al. 2007, arXiv:0709.1159",
	}
)

// assumed says in words what the named settings are, leaving out those that are
// exactly at their default and so change nothing.
func assumed(t *estimate.Task, settings ...method.Setting) []string {
	var lines []string
	for _, s := range settings {
		v := t.Settings[s.Name]
		if v.Set && (v.Nuisance != "" || v.Prior != s.Default.Prior) {
			lines = append(lines, stated(t, s))
		}
	}
	return lines
}

// stated says in words what a setting is.
func stated(t *estimate.Task, s method.Setting) string {
	v := t.Settings[s.Name]
	line := s.Name + ": " + v.Prior.String()
	if r, ok := halo.FindRelation(v.Relation); ok {
		line = fmt.Sprintf("%s: relation %q (%s), scatter %.2g in ln", s.Name, r.Name, r.Source, r.Scatter)
	}
	if s.Unit != "" {
		line += " " + s.Unit
	}
	if v.Nuisance != "" {
		line += fmt.Sprintf(" (nuisance.%s)", v.Nuisance)
	}
	return line
}
