package lensing

import (
	"context"
	"slices"

	"steelyard/probes/estimate"
	"steelyard/probes/infer"
	"steelyard/probes/method"
)

// combined fits one halo to the shear and to an Einstein radius at once.
var combined = estimate.Method{
	Declaration: method.Declaration{
		Name:     "combined",
		Version:  1,
		Summary:  "Fits one spherical halo to the tangential shear in bins and to an Einstein radius at once.",
		Equation: "χ² of tangential-shear + χ² of einstein-radius, with one halo, one elongation and one scale of the sources' distances",
		Sources:  tangentialShear.Sources,
		Data:     tangentialShear.Data,
		Settings: append(slices.Clone(tangentialShear.Settings),
			ringRadiusSetting, ringRedshiftSetting),
		Cautions: append([]string{
			"The radius is centred on the halo, the shear on the object's centre: `miscentring` moves the second alone.",
		}, tangentialShear.Cautions...),
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
		if err := f.addRing(); err != nil {
			return nil, err
		}
		return f.run(ctx)
	},
}
