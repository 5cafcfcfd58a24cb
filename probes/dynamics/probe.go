// Package dynamics weighs an object by the motions of its galaxies.
//
// A catalogue of positions and redshifts is reduced to a list of members, each
// galaxy with the verdict on it and the reason (reduceMembers). The methods
// draw their masses from that list, or where only a published dispersion is
// known from that: see Probe for what there is. One file holds one method.
//
// Velocities are those in the frame of the cluster, v = c (z − z̄)/(1 + z̄);
// masses are of the sphere.
package dynamics

import (
	"math"

	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/method"
)

// Probe is what the program knows of galaxy motions.
var Probe = estimate.Probe{
	Name:   "dynamics",
	Doc:    "Masses from the motions of member galaxies.",
	Blocks: []method.Block{galaxiesBlock, membersBlock, dispersionBlock},
	Reductions: []estimate.Reduction{{
		Name: "members", Version: 1, From: []string{"galaxies", "members?"}, Run: reduceMembers,
	}},
	Methods: []estimate.Method{dispersionScaling, virial, projectedMass, jeans, caustic, halfLight},
}

var galaxiesBlock = method.Block{
	Name:   "galaxies",
	Doc:    "A catalogue of galaxies with redshifts: members alone, or a whole field.",
	Select: true,
	Columns: []method.Column{
		{Name: "ra", Unit: "rad", Required: true, Doc: "right ascension, ICRS"},
		{Name: "dec", Unit: "rad", Required: true, Doc: "declination, ICRS"},
		{Name: "redshift", Required: true, Doc: "redshift, heliocentric or in the frame of the CMB alike: only differences about the mean are used"},
		{Name: "error", Doc: "error of the redshift; without it taken as zero, and said"},
		{Name: "weight", Doc: "weight of the galaxy among positions, the inverse of the completeness where it lies"},
		{Name: "magnitude", Doc: "apparent magnitude, to find the brightest galaxy by"},
	},
}

var membersBlock = method.Block{
	Name: "members",
	Doc:  "How members are told from the field. Without this block the shifting gapper does it.",
	Settings: []method.Setting{
		{
			Name: "method", Kind: method.Choice, Choices: []string{"given", "sigma-clip", "shifting-gapper", "caustic"},
			Default: method.Word("shifting-gapper"),
			Doc:     "given: the file holds members only; sigma-clip: within so many times the local dispersion; shifting-gapper: joined to the mean velocity without a gap, radius by radius; caustic: slower than the escape speed that the diagram of radius and velocity shows",
			Source:  "Mamon, Biviano & Murante 2010, A&A 520, A30; Fadda et al. 1996, ApJ 473, 670; Diaferio 1999, MNRAS 309, 610",
		},
		{
			Name: "centre", Kind: method.Choice, Choices: []string{"given", "brightest", "densest"}, Default: method.Word("given"),
			Doc: "given: the object's; brightest: the brightest galaxy within 2000 km/s of the object's redshift, by magnitude; densest: the one of these nearest to its tenth neighbour",
		},
		{
			Name: "window", Kind: method.Exact, Unit: "km/s", Default: method.Exactly(5000), Low: 500, High: 30000,
			Doc: "galaxies further than this from the object's redshift are not considered (common practice, no source)",
		},
		{
			Name: "gap", Kind: method.Exact, Unit: "km/s", Low: 50, High: 10000,
			Doc: "velocities further apart than this belong to different systems. Silent: 1000 km/s in the field as a whole and, for the shifting gapper, " +
				"500 (1 + exp(−(N−6)/33)) km/s in a bin of N galaxies, for a fixed gap of 1000 km/s (Fadda et al. 1996) finds no edge in dense samples",
			Source: "Katgert et al. 1996, A&A 310, 8; Adami et al. 1998, A&A 331, 439 (formula from memory); Lopes et al. 2009, MNRAS 392, 135",
		},
		{
			Name: "clip", Kind: method.Exact, Default: method.Exactly(2.7), Low: 1, High: 10,
			Doc:    "sigma-clip: members lie within so many times the dispersion at their radius",
			Source: "Mamon, Biviano & Murante 2010, A&A 520, A30",
		},
		{
			Name: "bin_width", Kind: method.Exact, Unit: "kpc", Length: true,
			Doc:    "shifting-gapper: width of the bin in projected radius; 0.4 Mpc divided by H0/(100 km/s/Mpc) when silent",
			Source: "Fadda et al. 1996, ApJ 473, 670",
		},
		{
			Name: "bin_count", Kind: method.Integer, Default: method.Exactly(15), Low: 5, High: 1e6,
			Doc:    "shifting-gapper: the bin is widened until it holds so many galaxies",
			Source: "Fadda et al. 1996, ApJ 473, 670",
		},
		{
			Name: "duplicates_within", Kind: method.Exact, Unit: "rad", Default: method.Exactly(math.Pi / 180 / 3600), Low: 0, High: math.Pi / 180 / 60,
			Doc: "two entries this close and within 1000 km/s are one galaxy; 1 arcsec by default (common practice, no source)",
		},
	},
}

var dispersionBlock = method.Block{
	Name:         "dispersion",
	Doc:          "A published velocity dispersion, when its galaxies are not at hand.",
	FileOptional: true,
	Settings: []method.Setting{
		{Name: "value", Kind: method.Measured, Unit: "km/s", Required: true, Doc: "line-of-sight dispersion in the frame of the cluster, with its error"},
		{Name: "within", Kind: method.Exact, Unit: "kpc", Length: true, Doc: "projected radius inside which it was measured; without it no aperture correction is made, and said"},
		{Name: "members", Kind: method.Integer, Low: fewest, High: 1e7, Doc: "number of galaxies it rests on"},
	},
}

// Settings that several methods share.
var (
	dispersionSetting = method.Setting{
		Name: "dispersion", Kind: method.Choice, Choices: []string{"automatic", "biweight", "gapper", "standard"}, Default: method.Word("automatic"),
		Doc:    "estimator of the dispersion; automatic is the biweight, with fewer than 15 members the gapper",
		Source: "Beers, Flynn & Gebhardt 1990, AJ 100, 32",
	}
	fitWithin = method.Setting{
		Name: "fit_within", Kind: method.Span, Unit: "kpc", Length: true,
		Doc: "projected radii of the members that are used; all of them when silent",
	}
	concentration = method.Setting{
		Name: "concentration", Kind: method.Number, Default: method.Related("duffy-2008"), Relation: relationNames(), Low: 0.1, High: 100,
		Doc:    "c_200c of the NFW halo along which the mass is carried to other radii",
		Source: "Duffy et al. 2008, MNRAS 390, L64",
	}
	velocityBias = method.Setting{
		Name: "velocity_bias", Kind: method.Number, Default: method.Exactly(1), Low: 0.1, High: 10,
		Doc: "b = σ_galaxies/σ_dark matter, or over the tracer of the relation used",
	}
	elongation = method.Setting{
		Name: "elongation", Kind: method.Number, Default: method.Exactly(1), Low: 0.1, High: 10,
		Doc:    "factor by which the halo's shape raises its projected mass; the line-of-sight variance rises as its power 8/5, the projected radii fall as its inverse",
		Source: "tensor virial theorem: Chandrasekhar 1969; Binney & Tremaine 2008, section 4.8.3",
	}
)

func relationNames() []string {
	var names []string
	for _, r := range halo.Relations() {
		names = append(names, r.Name)
	}
	return names
}
