package lensing

import (
	"context"
	"slices"

	"steelyard/probes/estimate"
	"steelyard/probes/infer"
	"steelyard/probes/method"
)

// tangentialShear fits a halo to the tangential shear in bins.
var tangentialShear = estimate.Method{
	Declaration: method.Declaration{
		Name:    "tangential-shear",
		Version: 1,
		Summary: "Fits a spherical halo to the tangential reduced shear in radial bins.",
		Equation: "⟨g⟩ = (1+m)(1−f) ⟨β⟩γ / (1 − (⟨β²⟩/⟨β⟩) κ), averaged over each bin\n" +
			"γ = ΔΣ/Σ_cr, κ = Σ/Σ_cr for a source at infinity; β = (D_ls/D_s)/(D_ls/D_s)_∞, 0 in the foreground",
		Sources: []string{
			"Seitz & Schneider 1997, A&A 318, 687 (mean over sources)",
			"Bartelmann 1996, A&A 313, 697; Wright & Brainerd 2000, ApJ 534, 34 (NFW shear)",
			"Navarro, Frenk & White 1997, ApJ 490, 493 (halo)",
			"Eisenstein & Hu 1998, ApJ 496, 605; Takahashi et al. 2012, ApJ 761, 152; Hoekstra 2003, MNRAS 339, 1155 (structure along the line of sight)",
		},
		Data: [][]string{{"galaxies", "bins"}, {"profile"}},
		Settings: slices.Concat(haloSettings, termSettings, []method.Setting{
			{
				Name: "fit_within", Kind: method.Span, Unit: "kpc", Length: true,
				Doc: "use only the bins that lie wholly between these radii",
			},
			shearBiasSetting, dilutionSetting, distanceScaleSetting, elongationSetting, miscentringSetting,
		}),
		Cautions: []string{
			"The mean over sources is of second order in κ: where g exceeds 0.3 it is low by several per cent; leave such bins out with fit_within.",
			"With shape noise alone the error does not hold structure along the line of sight, which can add as much (Hoekstra 2003, MNRAS 339, 1155), nor the variety of haloes.",
		},
		Measured: "On 400 invented catalogues of 12000 galaxies, their haloes, calibrations and elongations drawn from the priors, the 68% interval of M_200c " +
			"held the truth in 65.0 ± 2.4%, the 95% interval in 94.0 ± 1.1%, with a mean bias of ln M of −0.002 (typical error 0.24); " +
			"at one halo of 8e14 Msun on the relation of Duffy et al. 2008 the bias over 200 was −0.009 (typical error 0.21). " +
			"STEELYARD_SLOW=1 go test -v -run 'Coverage|BiasAtOneHalo' ./probes/lensing",
	},
	Uses: []string{"profile"},
	Run: func(ctx context.Context, t *estimate.Task) (*infer.Draws, error) {
		f, err := newLensFit(t)
		if err != nil {
			return nil, err
		}
		if err := f.addShear(); err != nil {
			return nil, err
		}
		return f.run(ctx)
	},
}
