package lensing

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/method"
)

// The settings that say which sources of error a fit of shear counts.
var (
	covarianceSetting = method.Setting{
		Name: "covariance", Kind: method.Choices, Choices: []string{"shape", "structure", "halo"},
		Doc: "which sources of error the fit counts: all three when silent, `shape` alone for a profile with a covariance of its own. `shape`: the noise of the galaxies' own shapes, or the profile's errors or covariance. " +
			"`structure`: matter along the line of sight. `halo`: how haloes of one mass differ, as far as no drawn parameter stands for it",
		Source: "Hoekstra 2003, MNRAS 339, 1155; Gruen et al. 2015, MNRAS 449, 4264",
	}
	sigma8Setting = method.Setting{
		Name: "sigma_8", Kind: method.Exact, Low: 0.1, High: 2, Default: method.Exactly(0.811),
		Doc: "rms of the linear density in spheres of 8/h Mpc, for `structure`", Source: "Planck Collaboration VI 2020, A&A 641, A6",
	}
	spectralIndexSetting = method.Setting{
		Name: "spectral_index", Kind: method.Exact, Low: 0.6, High: 1.4, Default: method.Exactly(0.965),
		Doc: "n_s of the linear power spectrum, for `structure`", Source: "Planck Collaboration VI 2020, A&A 641, A6",
	}
	baryonSetting = method.Setting{
		Name: "omega_baryon", Kind: method.Exact, Low: 1e-3, High: 0.2, Default: method.Exactly(0.0493),
		Doc: "baryons today in units of the critical density, for `structure`", Source: "Planck Collaboration VI 2020, A&A 641, A6",
	}
	orientationSetting = method.Setting{
		Name: "orientation_scatter", Kind: method.Exact, Low: 0, High: 1, Default: method.Exactly(0.13),
		Doc: "scatter of the ln of the projected mass at fixed mass, for `halo`, where `elongation` is not named: " +
			"0.13 scatters the mass of a fit by 0.2",
		Source: "Becker & Kravtsov 2011, ApJ 740, 25 (a scatter of 20% in mass; from memory)",
	}
	termSettings = []method.Setting{covarianceSetting, sigma8Setting, spectralIndexSetting, baryonSetting, orientationSetting}
)

// errorTerms lists the sources of error that a fit of the profile counts.
func errorTerms(t *estimate.Task, p *Profile) []string {
	if stated := t.Settings["covariance"].List; stated != nil {
		return stated
	}
	if p.Covariance != nil {
		return []string{"shape"}
	}
	return []string{"shape", "structure", "halo"}
}

// structure is the covariance that matter along the line of sight adds to the
// bins. The sources stand at one redshift, that of their mean efficiency.
func structure(t *estimate.Task, bins []Bin) (covariance []float64, redshift float64, err error) {
	beta := meanBeta(bins)
	e := newEfficiencies(t.Cosmology, t.Object.Redshift, 0)
	lo, hi := t.Object.Redshift, 20.0
	for hi-lo > 1e-6 {
		middle := (lo + hi) / 2
		if e.exact(middle) < beta {
			lo = middle
		} else {
			hi = middle
		}
	}
	s, err := newSpectrum(t.Cosmology, fluctuations{
		sigma8: t.Settings["sigma_8"].Prior.A, index: t.Settings["spectral_index"].Prior.A, baryons: t.Settings["omega_baryon"].Prior.A,
	})
	if err != nil {
		return nil, 0, err
	}
	c, err := s.convergence(hi)
	if err != nil {
		return nil, 0, err
	}
	distance := t.Cosmology.AngularDiameter(t.Object.Redshift)
	inner, outer := make([]float64, len(bins)), make([]float64, len(bins))
	for i, b := range bins {
		inner[i], outer[i] = b.Inner/distance, b.Outer/distance
	}
	return c.shearCovariance(inner, outer), hi, nil
}

// variety is how haloes of one mass differ in what no parameter is drawn for.
type variety struct {
	orientation   float64 // standard deviation of ln of the projected mass; 0 for none
	concentration float64 // of ln c; 0 for none
}

// newVariety holds only what is not drawn.
func newVariety(f *lensFit) variety {
	t := f.task
	var v variety
	if e := t.Settings["elongation"]; e.Nuisance == "" && e.Prior == elongationSetting.Default.Prior {
		v.orientation = t.Settings["orientation_scatter"].Prior.A
	}
	if slices.Contains(uses[f.halo.kind], "concentration") && !f.halo.shaped {
		if r, ok := halo.FindRelation("duffy-2008"); ok {
			v.concentration = r.Scatter
		}
	}
	return v
}

// modes fills out the change of every bin's shear by one standard deviation of
// each part, predict being the shear of a lens.
func (v variety) modes(l lens, m *massModel, expected []float64, predict func(lens, []float64), out [][]float64) [][]float64 {
	const step = 0.02 // of the logarithm
	n := 0
	add := func(other lens, sd float64) {
		predict(other, out[n])
		for i := range expected {
			out[n][i] = (out[n][i] - expected[i]) / step * sd
		}
		n++
	}
	if v.orientation > 0 {
		other := l
		other.elongation *= math.Exp(step)
		add(other, v.orientation)
	}
	if v.concentration > 0 {
		other := l
		other.Model = m.with(m.mass.Of(l.theta), m.concentration.Of(l.theta, m.mass.Of(l.theta))*math.Exp(step), l.theta)
		add(other, v.concentration)
	}
	return out[:n]
}

// terms says in words which sources of error are counted.
func (s *shearPart) terms() string {
	text := "errors: shape noise"
	if s.profile.Covariance != nil {
		text = "errors: the covariance given with the profile"
	}
	var off []string
	if s.measure.added != nil {
		text += fmt.Sprintf(", structure along the line of sight to z = %.2f (σ_8 = %g)", s.structureTo, s.task.Settings["sigma_8"].Prior.A)
	} else if s.profile.Covariance == nil {
		off = append(off, "structure along the line of sight")
	}
	switch {
	case s.variety == nil:
		if s.profile.Covariance == nil {
			off = append(off, "the variety of haloes")
		}
	case *s.variety == variety{}:
		text += ", the variety of haloes by what is drawn"
	default:
		var parts []string
		if s.variety.orientation > 0 {
			parts = append(parts, fmt.Sprintf("in orientation (%.2g in ln of the projected mass)", s.variety.orientation))
		}
		if s.variety.concentration > 0 {
			parts = append(parts, fmt.Sprintf("in concentration (%.2g in ln)", s.variety.concentration))
		}
		text += ", the variety of haloes " + strings.Join(parts, " and ")
	}
	if len(off) == 2 {
		text += " alone"
	}
	if len(off) > 0 {
		text += "; left out: " + strings.Join(off, ", ")
	}
	return text
}
