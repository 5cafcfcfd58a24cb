package lensing

import (
	"context"
	"slices"

	"steelyard/probes/estimate"
	"steelyard/probes/infer"
	"steelyard/probes/method"
)

// combined fits one halo to the shear and to what is seen of its strong lensing.
var combined = estimate.Method{
	Declaration: method.Declaration{
		Name:     "combined",
		Version:  2,
		Summary:  "Fits one halo to the tangential shear in bins and to an Einstein radius, or families of multiple images, at once.",
		Equation: "χ² of tangential-shear + χ² of einstein-radius or image-positions, with one halo, one elongation and one scale of the sources' distances",
		Sources:  append(slices.Clone(tangentialShear.Sources), imagePositions.Sources...),
		Data:     tangentialShear.Data,
		Settings: slices.Concat(tangentialShear.Settings,
			[]method.Setting{optional(ringRadiusSetting), optional(ringRedshiftSetting)}, imageSettings),
		Cautions: slices.Concat([]string{
			"The radius or the images are centred on the halo, the shear on the object's centre: `miscentring` moves the second alone.",
			"The shear sees the halo round and alone: ellipticity, external shear and the `components` of the images do not enter it.",
		}, tangentialShear.Cautions, imagePositions.Cautions),
	},
	Uses: []string{"profile", "images"},
	Run: func(ctx context.Context, t *estimate.Task) (*infer.Draws, error) {
		f, err := newLensFit(t)
		if err != nil {
			return nil, err
		}
		if err := f.addShear(); err != nil {
			return nil, err
		}
		radius, redshift := t.Settings["radius"].Set, t.Settings["source_redshift"].Set
		_, images := t.Reduced["images"]
		switch {
		case images && (radius || redshift):
			return nil, t.Errorf("the strong lensing is given twice, by the block `images` and by `radius` and `source_redshift`; keep one")
		case images:
			err = f.addImages()
		case radius && redshift:
			err = f.addRing()
		default:
			err = t.Errorf("there is no strong lensing to combine with the shear: give `radius` and `source_redshift`, or a block `images`")
		}
		if err != nil {
			return nil, err
		}
		return f.run(ctx)
	},
}

// optional is the setting where it need not be given.
func optional(s method.Setting) method.Setting {
	s.Required = false
	return s
}
