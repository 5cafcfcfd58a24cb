package lensing

import "steelyard/probes/method"

// sourcesBlock is a distribution of source redshifts.
var sourcesBlock = method.Block{
	Name: "sources",
	Doc:  "The redshift distribution of the sources, foreground included: one row a redshift, with its weight.",
	Columns: []method.Column{
		{Name: "redshift", Required: true, Doc: "redshift of the sources of this row"},
		{Name: "weight", Doc: "their weight; without it every row weighs the same"},
	},
}

var sourceRedshift = method.Setting{
	Name: "source_redshift", Kind: method.Exact, Low: 1e-6, High: 1100,
	Doc: "one effective redshift for all sources",
}

var blocks = []method.Block{
	{
		Name: "galaxies",
		Doc: "A catalogue of galaxy shapes, one row a galaxy: ε = (a−b)/(a+b) on the axes of right ascension and declination. " +
			"Every galaxy needs a redshift, its own or an effective one; one that is not behind the lens counts with no shear.",
		Select: true,
		Columns: []method.Column{
			{Name: "ra", Unit: "rad", Required: true, Doc: "right ascension, ICRS"},
			{Name: "dec", Unit: "rad", Required: true, Doc: "declination, ICRS"},
			{Name: "e1", Required: true, Doc: "ellipticity along the axes: positive for an image drawn out east–west"},
			{Name: "e2", Required: true, Doc: "ellipticity along the diagonals: positive as `handedness` says"},
			{Name: "weight", Doc: "weight of the shape; without it every galaxy weighs the same"},
			{Name: "redshift", Doc: "redshift of the galaxy; without it `source_redshift` or `sources`"},
			{Name: "multiplicative", Doc: "multiplicative bias m of the galaxy's shape: the shear is Σ w e / Σ w (1+m)"},
		},
		Settings: []method.Setting{
			{
				Name: "handedness", Kind: method.Choice, Choices: []string{"east", "west"}, Default: method.Word("east"),
				Doc: "which way the x axis of the shapes points, the y axis pointing north. `east`: towards rising right ascension, so that e2 > 0 is an image " +
					"drawn out from south-west to north-east. `west`: towards falling right ascension, as x runs in an image with north up and east left, so that e2 > 0 " +
					"is drawn out from south-east to north-west",
			},
			sourceRedshift,
			{
				Name: "additive_e1", Kind: method.Exact, Low: -1, High: 1, Default: method.Exactly(0),
				Doc: "additive bias of e1, taken off every shape",
			},
			{
				Name: "additive_e2", Kind: method.Exact, Low: -1, High: 1, Default: method.Exactly(0),
				Doc: "additive bias of e2 as it stands in the file, taken off every shape",
			},
			{
				Name: "responsivity", Kind: method.Exact, Low: 0.01, High: 10, Default: method.Exactly(1),
				Doc:    "mean shape that a unit shear makes: 1 for (a−b)/(a+b), for (a²−b²)/(a²+b²) about 2(1−σ²), σ being the scatter of one component. Shears and their errors are divided by it",
				Source: "Bernstein & Jarvis 2002, AJ 123, 583",
			},
		},
		Blocks:       []method.Block{sourcesBlock},
		Alternatives: [][][]string{{{"redshift"}, {"source_redshift"}, {"sources"}}},
	},
	{
		Name: "bins",
		Doc:  "The radial bins into which the galaxies are gathered: `count` bins of equal width in the logarithm, or their `edges`.",
		Settings: []method.Setting{
			{Name: "from", Kind: method.Exact, Unit: "kpc", Length: true, Doc: "inner edge of the first bin"},
			{Name: "to", Kind: method.Exact, Unit: "kpc", Length: true, Doc: "outer edge of the last bin"},
			{Name: "count", Kind: method.Integer, Low: 3, High: 1000, Doc: "number of bins"},
			{Name: "edges", Kind: method.List, Unit: "kpc", Length: true, Doc: "all edges in rising order, instead of `from`, `to` and `count`"},
		},
		Alternatives: [][][]string{{{"from", "to", "count"}, {"edges"}}},
	},
	{
		Name: "profile",
		Doc:  "A binned profile of the tangential reduced shear. With `inner` and `outer` the model is averaged over the area of each bin, with `radius` it is taken there.",
		Columns: []method.Column{
			{Name: "radius", Unit: "kpc", Length: true, Doc: "radius at which the shear is quoted"},
			{Name: "inner", Unit: "kpc", Length: true, Doc: "inner edge of the bin"},
			{Name: "outer", Unit: "kpc", Length: true, Doc: "outer edge of the bin"},
			{Name: "value", Required: true, Doc: "tangential reduced shear"},
			{Name: "error", Doc: "its error"},
			{Name: "minus", Doc: "size of the error below"},
			{Name: "plus", Doc: "size of the error above"},
			{Name: "low", Doc: "lower bound of the interval"},
			{Name: "high", Doc: "upper bound of the interval"},
			{Name: "cross", Doc: "cross component, which gravity leaves at zero"},
		},
		Alternatives: [][][]string{
			{{"radius"}, {"inner", "outer"}},
			{{"error"}, {"minus", "plus"}, {"low", "high"}},
			{{"source_redshift"}, {"sources"}},
		},
		Settings: []method.Setting{sourceRedshift},
		Blocks: []method.Block{
			sourcesBlock,
			{
				Name: "covariance",
				Doc: "The covariance of the tangential shears, which takes the place of their errors: one row a pair of bins, or, with no column named, a square matrix with one row and one column a bin. " +
					"In the first form a pair may be given once or both ways, and is zero when left out.",
				Columns: []method.Column{
					{Name: "first", Doc: "number of one bin, counted from 1 in the order of the profile"},
					{Name: "second", Doc: "number of the other"},
					{Name: "value", Doc: "their covariance"},
				},
				Alternatives: [][][]string{{{"first", "second", "value"}, {}}},
			},
		},
	},
	{
		Name: "images",
		Doc:  "Families of multiple images: one row an image, those of one source at one redshift.",
		Columns: []method.Column{
			{Name: "source", Text: true, Required: true, Doc: "name of the source, which its images share"},
			{Name: "ra", Unit: "rad", Required: true, Doc: "right ascension, ICRS"},
			{Name: "dec", Unit: "rad", Required: true, Doc: "declination, ICRS"},
			{Name: "error", Unit: "rad", Required: true, Doc: "error of the place in each coordinate, arcsec"},
			{Name: "redshift", Required: true, Doc: "redshift of the source"},
		},
	},
	{
		Name: "components",
		Doc:  "Places of lenses beside the halo, galaxies above all: one row a truncated isothermal sphere, elliptical when its shape is given. With luminosities, one dispersion holds for all, σ ∝ L^¼.",
		Columns: []method.Column{
			{Name: "ra", Unit: "rad", Required: true, Doc: "right ascension, ICRS"},
			{Name: "dec", Unit: "rad", Required: true, Doc: "declination, ICRS"},
			{Name: "luminosity", Doc: "luminosity, in any unit"},
			{Name: "ellipticity", Doc: "ellipticity ε of its potential, whose axes are in the ratio √((1−ε)/(1+ε))"},
			{Name: "position_angle", Unit: "rad", Doc: "direction of its major axis, from north through east"},
		},
	},
}
