package lensing

import (
	"context"
	"encoding"
	"fmt"

	"steelyard/probes/estimate"
)

// profileReduction makes the profile that every method of shear fits.
var profileReduction = estimate.Reduction{
	Name: "profile", Version: 2,
	From: []string{"galaxies?", "galaxies.sources?", "bins?", "profile?", "profile.sources?", "profile.covariance?"},
	Run: func(ctx context.Context, t *estimate.Task) (encoding.BinaryMarshaler, error) {
		p, err := reduce(ctx, t)
		if err != nil {
			return nil, t.Errorf("%w", err)
		}
		return p, nil
	},
}

func reduce(ctx context.Context, t *estimate.Task) (*Profile, error) {
	catalogued, published := t.Tables["galaxies"] != nil, t.Tables["profile"] != nil
	switch {
	case catalogued && published:
		return nil, fmt.Errorf("the shear is given twice, by `galaxies` and by `profile`; put them into blocks of their own")
	case catalogued:
		return reduceGalaxies(ctx, t)
	case published:
		if _, binned := t.Blocks["bins"]; binned {
			return nil, fmt.Errorf("`bins` gather `galaxies`; a `profile` has bins of its own")
		}
		return readProfile(t)
	}
	return nil, fmt.Errorf("there is no shear: give `galaxies` and `bins`, or `profile`")
}
