package dynamics

import (
	"context"
	"fmt"

	"steelyard/probes/constants"
	"steelyard/probes/estimate"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// halfLight is the estimator of Wolf et al. 2010 for a single galaxy.
var halfLight = estimate.Method{
	Declaration: method.Declaration{
		Name:    "half-light",
		Version: 1,
		Summary: "Mass of a single galaxy inside its half-light radius, where it depends least on the orbits.",
		Equation: "M(<r_1/2) = 3 σ_los² r_1/2/G,  r_1/2 = (4/3) R_e\n" +
			"σ_los the dispersion of all the stars, R_e the projected half-light radius",
		Sources: []string{"Wolf et al. 2010, MNRAS 406, 1220"},
		Data:    [][]string{{"dispersion"}, {"galaxies"}},
		Settings: []method.Setting{
			{
				Name: "mass", Kind: method.Number, Unit: "solMass", Low: 1e8, High: 1e18,
				Default: method.Distributed(prior.LogUniform(1e9, 1e16)),
				Doc:     "prior on M_200c of the halo along which the mass is carried",
			},
			{
				Name: "half_light_radius", Kind: method.Measured, Unit: "kpc", Length: true, Required: true, Low: 1e-6, High: 1e4,
				Doc: "projected radius that holds half the light, with its error",
			},
			dispersionSetting, fitWithin, concentration,
			{
				Name: "intrinsic_scatter", Kind: method.Number, Default: method.Exactly(0), Low: 0, High: 2,
				Doc: "scatter of ln M about the spherical truth",
			},
		},
		Cautions: []string{
			"Exact only where σ_los does not change with radius: for a self-consistent Plummer sphere it gives 0.77 of the truth.",
			"Away from r_1/2 the mass is that of an NFW halo, an assumption and not a measurement.",
		},
	},
	Uses: []string{"members"},
	Run:  runHalfLight,
}

// HalfLightMass is 3 σ² (4/3) R_e/G in Msun for a dispersion in km/s and a
// projected half-light radius in kpc.
func HalfLightMass(sigma, radius float64) float64 {
	return 4 * sigma * sigma * radius / constants.G
}

func runHalfLight(ctx context.Context, t *estimate.Task) (*infer.Draws, error) {
	obs, err := observe(ctx, t)
	if err != nil {
		return nil, err
	}
	a := &assumptions{threshold: 200 * t.Cosmology.CriticalDensity(t.Object.Redshift)}
	a.dispersion = a.column("dispersion", "km/s")
	a.bias, a.elongation = estimate.Fixed(1), estimate.Fixed(1)
	if a.concentration, err = a.parameters.Concentration(t); err != nil {
		return nil, err
	}
	size := t.Settings["half_light_radius"]
	if !(size.Prior.A > 0) {
		return nil, t.Errorf("half_light_radius must be positive")
	}
	scale := kpc(t, 1, size.Unit)
	radius := a.parameters.Draw("half_light_radius", "kpc", scaled(size.Prior, scale))
	drawn, err := a.draw(t, obs, func(_ int, theta []float64) (m200, c float64) {
		re := radius.Of(theta)
		if !(re > 0) {
			return 0, 0
		}
		return a.through(t, HalfLightMass(a.dispersion.Of(theta), re), 4./3*re, theta)
	})
	if err != nil {
		return nil, err
	}
	within := make([]float64, len(drawn.Values))
	for i, theta := range drawn.Values {
		within[i] = 4. / 3 * radius.Of(theta)
	}
	covers := infer.Percentiles(within, 16, 50, 84)
	return finish(t, obs.sample, estimate.Fit{
		Sample: drawn, Parameters: &a.parameters, LnMass: a.lnMass,
		Covers: [2]float64{covers[0], covers[2]},
		Assumes: append(obs.assumes,
			fmt.Sprintf("mass inside r_1/2 = (4/3) R_e = %.3g kpc (Wolf et al. 2010)", covers[1]), a.concentrationLine(t)),
		Checks:   obs.checks,
		Warnings: obs.warnings,
	})
}

// scaled is the distribution of a quantity multiplied by a factor.
func scaled(p prior.Prior, factor float64) prior.Prior {
	p.A *= factor
	if p.Kind != prior.LogNormalKind {
		p.B *= factor
		p.C *= factor
	}
	return p
}
