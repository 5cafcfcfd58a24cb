package lensing

import (
	"context"
	"fmt"
	"math"
	"slices"

	"steelyard/probes/estimate"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// imageSettings are what a fit of images has beside the halo.
var imageSettings = []method.Setting{
	{
		Name: "ellipticity", Kind: method.Exact, Low: 0, High: roundest, Default: method.Exactly(0.1),
		Doc: "standard deviation of the normal prior of each component, ε cos 2φ and ε sin 2φ, of the ellipticity of the halo's potential, φ being the direction of the major axis " +
			"counted from east towards north; 0 for a round halo. The surface density is about three times as elliptical",
		Source: "Golse & Kneib 2002, A&A 390, 821",
	},
	{
		Name: "external_shear", Kind: method.Exact, Low: 0, High: 1, Default: method.Exactly(0.05),
		Doc: "standard deviation of the normal prior of each component of an even shear, for a source at infinity; 0 for none",
	},
	{
		Name: "centre_error", Kind: method.Exact, Unit: "kpc", Length: true, Low: 0, High: 1e4, Default: method.Exactly(20),
		Doc: "standard deviation of the normal prior of the halo's centre about the object's, in each coordinate; 0 holds it there",
	},
	{
		Name: "position_scatter", Kind: method.Number, Unit: "rad", Low: 0, High: 60 * arcsec, Default: method.Exactly(0),
		Doc: "scatter of the images about those of the model beyond their errors, in each coordinate, added in quadrature: what the model leaves out. " +
			"For a cluster of galaxies measured to a tenth of an arcsecond, half_normal(\"1 arcsec\")",
	},
	{
		Name: "component_dispersion", Kind: method.Number, Unit: "km/s", Low: 1, High: 3000,
		Default: method.Distributed(prior.LogUniform(30, 600)),
		Doc:     "velocity dispersion of each of the `components`, or, when they have luminosities, of the brightest",
	},
	{
		Name: "component_core_radius", Kind: method.Exact, Unit: "kpc", Length: true, Low: 1e-3, High: 1e3, Default: method.Exactly(0.1),
		Doc: "core radius of the components (of the brightest, when they have luminosities)",
	},
	{
		Name: "component_cut_radius", Kind: method.Exact, Unit: "kpc", Length: true, Low: 0.1, High: 1e4, Default: method.Exactly(50),
		Doc: "radius at which the components are cut off (common practice for galaxies of clusters, no source)",
	},
}

// imagePositions fits an elliptical halo to families of multiple images.
var imagePositions = estimate.Method{
	Declaration: method.Declaration{
		Name:    "image-positions",
		Version: 1,
		Summary: "Fits an elliptical halo, further components and an external shear to the places of multiple images.",
		Equation: "β = θ − (D_ls/D_s)/(D_ls/D_s)_∞ [α_halo + Σ α_component + Γ θ], one β a source; χ² = Σ |θ_model − θ|²/(σ² + s²) in the image plane,\n" +
			"begun in the source plane with |A⁻¹(β_i − β̄)|²; sources marginalised over an even prior\n" +
			"ψ(θ) = ψ_round(ρ), ρ² = (1−ε) x² + (1+ε) y² along the axes; components: ρ ∝ 1/(r²+r_c²) − 1/(r²+r_t²)",
		Sources: []string{
			"Schneider, Ehlers & Falco 1992, Gravitational Lenses (lens equation; from memory)",
			"Golse & Kneib 2002, A&A 390, 821 (elliptical potential)",
			"Kneib et al. 1996, ApJ 471, 643 (fit of several components; truncated isothermal sphere)",
			"Faber & Jackson 1976, ApJ 204, 668 (components by luminosity)",
		},
		Data:     [][]string{{"images"}},
		Settings: slices.Concat(haloSettings, imageSettings, []method.Setting{distanceScaleSetting, elongationSetting}),
		Cautions: []string{
			"Images measure the mass inside the cylinder they span. Masses beyond, and any sphere's, rest on the halo's shape.",
			"The potential is elliptical, not the mass: above an ellipticity of 0.25 the surface density has a waist, and 0.3 is refused. The mass inside a circle is that of the round halo to second order in the ellipticity.",
			"Models of clusters seldom reach the astrometric error: without `position_scatter` a poor fit has errors that are too small.",
			"Images that the model makes and nobody saw are not counted against it.",
			"A prior on `position_scatter`, and components of drawn dispersion, make the posterior long and curved: the draws can then take minutes.",
			"A component beside the centre counts in the sphere of radius r with its mass inside r less its distance on the sky.",
		},
	},
	Uses: []string{"images"},
	Run: func(ctx context.Context, t *estimate.Task) (*infer.Draws, error) {
		f, err := newLensFit(t)
		if err != nil {
			return nil, err
		}
		if err := f.addImages(); err != nil {
			return nil, err
		}
		return f.run(ctx)
	},
}

// addComponents adds the components to ln M(<r).
func (p *imagesPart) addComponents(theta, radii, lnMass []float64) {
	east, north := p.centre[0].Of(theta), p.centre[1].Of(theta)
	for i, c := range p.images.Components {
		g := p.component(i, theta)
		away := math.Hypot(c.X*p.distance-east, c.Y*p.distance-north)
		for j, r := range radii {
			if r > away {
				lnMass[j] += math.Log1p(g.Mass(r-away) / math.Exp(lnMass[j]))
			}
		}
	}
}

func (p *imagesPart) state(best lens, fit *estimate.Fit) {
	t, n := p.fit.task, p.images.count()
	rms, chi2, missing := p.rms(best)
	fit.Chi2 += chi2
	constraints := 2 * (n - len(p.images.Families))
	fit.Dof += constraints - p.drawn
	far, z := 0.0, 0.0
	for _, f := range p.images.Families {
		z = max(z, f.Redshift)
		for _, image := range f.Images {
			r := math.Hypot(image.X, image.Y) * p.distance
			far = max(far, r)
			cover(fit, r, r)
		}
	}
	s := p.scatter.Of(best.theta)
	typical := math.Sqrt(2 * (p.meanError2() + s*s))
	check := infer.Check{
		Name: "rms of the images", Statistic: rms / arcsec, PValue: -1, Passed: rms < 2*typical,
		Note: "arcsec between the images and those of the best fit",
	}
	if !check.Passed {
		check.Note = ""
		fit.Warnings = append(fit.Warnings, fmt.Sprintf("the best fit misses the images by %.2g arcsec, where %.2g are expected: allow for what the model leaves out with position_scatter, or add components", rms/arcsec, typical/arcsec))
	}
	fit.Checks = append(fit.Checks, check, infer.Check{
		Name: "families the best fit does not make", Statistic: float64(missing), PValue: -1, Passed: missing == 0,
	})
	if missing > 0 {
		fit.Warnings = append(fit.Warnings, fmt.Sprintf("the best fit does not make all images of %d of %d families: their distances are carried back from the source plane", missing, len(p.images.Families)))
	}
	if drawn := len(p.fit.parameters.Free); constraints < drawn {
		fit.Warnings = append(fit.Warnings, fmt.Sprintf("the images give %d constraints on %d parameters: the priors decide what they do not", constraints, drawn))
	}
	fit.Assumes = append(fit.Assumes, fmt.Sprintf("images: %d of %d sources, to %.4g kpc from the centre", n, len(p.images.Families), far))
	if k := len(p.images.Components); k > 0 {
		fit.Assumes = append(fit.Assumes, fmt.Sprintf("components: %d truncated isothermal spheres, core %.4g kpc, cut off at %.4g kpc", k, p.core, p.cut))
	}
	fit.Assumes = append(fit.Assumes, assumed(t, p.scatterSetting())...)
	critical := t.Cosmology.SigmaCritical(t.Object.Redshift, z)
	of := func(g func(lens) float64) func([]float64) float64 {
		return func(theta []float64) float64 {
			l, _ := p.fit.at(theta)
			return g(l)
		}
	}
	fit.Assumes = append(fit.Assumes, fmt.Sprintf("einstein_radius: of the halo, circularised, for a source at redshift %g", z))
	fit.Derived = append(fit.Derived,
		estimate.Derived{Name: "einstein_radius", Unit: "arcsec", Of: of(func(l lens) float64 {
			return meanSurfaceRadius(l.Model, critical/(l.elongation*l.distance)) / p.distance / arcsec
		})},
		estimate.Derived{Name: "image_rms", Unit: "arcsec", Of: of(func(l lens) float64 {
			rms, _, _ := p.rms(l)
			return rms / arcsec
		})},
	)
}

func (p *imagesPart) scatterSetting() method.Setting {
	i := slices.IndexFunc(imageSettings, func(s method.Setting) bool { return s.Name == "position_scatter" })
	return imageSettings[i]
}
