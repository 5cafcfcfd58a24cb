package xray

import (
	"fmt"

	"steelyard/probes/halo"
	"steelyard/probes/infer"
	"steelyard/probes/prior"
)

// poorFit is the p-value below which a fit is called poor.
const poorFit = 1e-3

// coolGas is the temperature in keV below which the spectroscopic-like weight
// is not calibrated (Mazzotta et al. 2004, section 3).
const coolGas = 3

// assumes says in words what the masses rest on.
func (f *fit) assumes() []string {
	lines := []string{f.gas.describe(2 * f.covers()[1])}
	if f.spectra.Projected {
		lines = append(lines, "temperatures projected along the whole line of sight with the spectroscopic-like weight n² T^(-3/4) (Mazzotta et al. 2004)")
	} else {
		lines = append(lines, "temperatures taken as those of spherical shells (projected = false)")
	}
	if f.support.radial {
		lines = append(lines, "pressure that is not thermal: the mean of simulated clusters with radius (Nelson, Lau & Nagai 2014)")
	}
	return append(lines, f.stated("temperature_scale", "temperature_scatter", f.support.setting(), "mean_molecular_weight",
		"electron_molecular_weight", "clumping", "intrinsic_scatter")...)
}

// neutral holds the assumptions that need no mention at the value at which they
// change nothing.
var neutral = map[string]float64{"temperature_scale": 1, "clumping": 1}

// stated says in words what the named settings are.
func (f *fit) stated(names ...string) []string {
	var lines []string
	for _, name := range names {
		v := f.task.Settings[name]
		if x, ok := neutral[name]; !v.Set || ok && v.Nuisance == "" && v.Prior == prior.Exact(x) {
			continue
		}
		line := name + ": " + v.Prior.String()
		if r, ok := halo.FindRelation(v.Relation); ok {
			line = fmt.Sprintf("%s: relation %q (%s), scatter %.2g in ln", name, r.Name, r.Source, r.Scatter)
		}
		if v.Unit != "" {
			line += " " + v.Unit
		}
		if v.Nuisance != "" {
			line += fmt.Sprintf(" (nuisance.%s)", v.Nuisance)
		}
		lines = append(lines, line)
	}
	return lines
}

// covers is the range of radii that the temperatures reach.
func (f *fit) covers() [2]float64 {
	return [2]float64{f.spectra.Inner[0], f.spectra.Outer[f.spectra.Len()-1]}
}

// describe says where the density comes from, how well it fits, and how it goes
// on at r kpc, beyond the data.
func (g *Gas) describe(r float64) string {
	slope, sd := g.Slope(r)
	s := "density: " + g.Words
	if g.Fitted {
		s += fmt.Sprintf(", χ² = %.1f for %d degrees of freedom", g.Chi2, g.Dof)
	}
	s += fmt.Sprintf("; its logarithmic slope is %.2f", slope)
	if sd > 0 {
		s += fmt.Sprintf(" ± %.2f", sd)
	}
	return s + fmt.Sprintf(" at %.4g kpc", r)
}

// warnings lists what the reader must know about the data and the fit.
func (f *fit) warnings(q bestFit) []string {
	var w []string
	s, g, n := f.spectra, f.gas, f.spectra.Len()
	w = append(append(w, g.Notes...), s.Notes...)
	if q.dof > 0 && q.pValue < poorFit {
		line := fmt.Sprintf("the fit is poor with the quoted temperature errors alone: χ² = %.0f for %d degrees of freedom (p = %.1g)", q.chi2, q.dof, q.pValue)
		if f.scatter.Drawn() {
			line += "; the temperature scatter drawn with the mass makes up for it"
		}
		w = append(w, line)
	}
	if n <= f.fitted {
		w = append(w, fmt.Sprintf("%d temperature bins for %d free parameters: the result leans on the priors", n, f.fitted))
	}
	if kT := s.coolest(); kT < coolGas {
		w = append(w, fmt.Sprintf("the coolest bin has kT = %.2g keV; below %d keV the weight that turns gas into a spectral temperature is not calibrated", kT, coolGas))
	}
	if g.Fitted {
		if g.Dof > 0 {
			if p := infer.ChiSquareP(g.Chi2, g.Dof); p < poorFit {
				w = append(w, fmt.Sprintf("the density form fits its data poorly: χ² = %.0f for %d degrees of freedom (p = %.1g); its error is too small", g.Chi2, g.Dof, p))
			}
		}
		if g.Outer < s.Outer[n-1]*(1-touching) {
			w = append(w, fmt.Sprintf("the density data end at %.4g kpc, inside the temperature bins, which end at %.4g kpc: the density between is extrapolated", g.Outer, s.Outer[n-1]))
		}
		if g.Inner > s.Outer[0] {
			w = append(w, fmt.Sprintf("the density data begin at %.4g kpc, outside the first temperature bin, which ends at %.4g kpc: the density inside is extrapolated", g.Inner, s.Outer[0]))
		}
	}
	if slope, _ := g.Slope(2 * s.Outer[n-1]); slope > -1.2 || slope < -4.5 {
		w = append(w, fmt.Sprintf("beyond the temperatures the density falls as r^(%.1f); clusters have r^(-2) to r^(-3) there, and the outer bins see this gas along the line of sight", slope))
	}
	return w
}
