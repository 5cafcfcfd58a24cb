package xray

import "steelyard/probes/method"

// edges are the columns that place a bin.
var edges = []method.Column{
	{Name: "inner", Unit: "kpc", Length: true, Doc: "inner edge"},
	{Name: "outer", Unit: "kpc", Length: true, Doc: "outer edge"},
	{Name: "radius", Unit: "kpc", Length: true, Doc: "middle, with half_width, instead of the edges"},
	{Name: "half_width", Unit: "kpc", Length: true, Doc: "half the width of the bin"},
}

// measured are the columns of a value with its errors.
func measured(unit, doc string) []method.Column {
	return []method.Column{
		{Name: "value", Unit: unit, Required: true, Doc: doc},
		{Name: "error", Unit: unit, Doc: "its error, the same on both sides"},
		{Name: "minus", Unit: unit, Doc: "size of the error below"},
		{Name: "plus", Unit: unit, Doc: "size of the error above"},
		{Name: "low", Unit: unit, Doc: "lower bound, the 16th percentile"},
		{Name: "high", Unit: unit, Doc: "upper bound, the 84th percentile"},
	}
}

var alternatives = [][][]string{
	{{"inner", "outer"}, {"radius", "half_width"}},
	{{"error"}, {"minus", "plus"}, {"low", "high"}},
}

// formParameter declares one parameter of a published density model.
func formParameter(name, unit, doc string) method.Setting {
	return method.Setting{Name: name, Kind: method.Measured, Unit: unit, Length: unit == "kpc", Doc: doc}
}

var densityBlock = method.Block{
	Name: "density",
	Doc: "The electron density n_e: deprojected shells in a file, to which a form is fitted, or a published model and its parameters. " +
		"Without `model`, shells get the modified β model (a β model when they are fewer than eight). The errors of the shells are taken as independent.",
	Columns:      append(append([]method.Column{}, edges...), measured("cm**-3", "electron density of the shell")...),
	FileOptional: true,
	Alternatives: alternatives,
	Settings: []method.Setting{
		{
			Name: "model", Kind: method.Choice, Choices: []string{string(Beta), string(DoubleBeta), string(ModifiedBeta)},
			Doc: "the form fitted to the shells, or, without a file, the published one: " +
				"`beta` and `double-beta` give n_e, the latter as a sum of two; `modified-beta` is eq. 3 of Vikhlinin et al. 2006 for n_p n_e, n_e = (1.2 n_p n_e)^½",
			Source: "Cavaliere & Fusco-Femiano 1978; LaRoque et al. 2006; Vikhlinin et al. 2006",
		},
		formParameter("n0", "cm**-3", "central density of the first component"),
		formParameter("rc", "kpc", "core radius of the first component"),
		formParameter("beta", "", "outer slope of the first component"),
		formParameter("alpha", "", "inner slope (modified-beta); 0 when left out"),
		formParameter("rs", "kpc", "radius where the slope steepens (modified-beta)"),
		formParameter("epsilon", "", "by how much it steepens (modified-beta); 0 when left out"),
		formParameter("gamma", "", "how sharply it steepens (modified-beta); 3 when left out"),
		formParameter("n02", "cm**-3", "central density of the second component; none when left out (modified-beta)"),
		formParameter("rc2", "kpc", "core radius of the second component"),
		formParameter("beta2", "", "outer slope of the second component"),
	},
}

var brightnessBlock = method.Block{
	Name: "surface_brightness",
	Doc: "The X-ray surface brightness in annuli, instead of a density: a form of the density is projected and fitted to it. " +
		"The unit of the values is free, since emission_measure_per_count turns them into emission measures.",
	Columns:      append(append([]method.Column{}, edges...), measured("", "surface brightness of the annulus")...),
	Alternatives: alternatives,
	Settings: []method.Setting{
		{
			Name: "emission_measure_per_count", Kind: method.Exact, Unit: "cm**-6 kpc", Required: true, Low: 1e-30, High: 1e30,
			Doc: "the emission measure along the line of sight, ∫ n_e n_p dl, of a surface brightness of one, for the instrument, the band and a typical temperature and abundance",
		},
		{
			Name: "background", Kind: method.Measured, Default: method.Exactly(0),
			Doc: "surface brightness of the sky and the instrument, in the unit of the values; with an error it is fitted with the density",
		},
		{
			Name: "model", Kind: method.Choice, Choices: []string{string(Beta), string(DoubleBeta), string(ModifiedBeta)},
			Doc: "the form of the density; as in the density block", Source: "Cavaliere & Fusco-Femiano 1978; LaRoque et al. 2006; Vikhlinin et al. 2006",
		},
	},
}

var temperatureBlock = method.Block{
	Name:         "temperature",
	Doc:          "Temperatures kT from spectra, one row a bin.",
	Columns:      append(append([]method.Column{}, edges...), measured("keV", "temperature of the bin")...),
	Alternatives: alternatives,
	Settings: []method.Setting{
		{
			Name: "projected", Kind: method.Flag, Default: method.Value{Set: true, Flag: true},
			Doc: "true for spectra of annuli on the sky, which see all gas along the line of sight; false for deprojected shells",
		},
		{
			Name: "model", Kind: method.Choice, Planned: []string{"cool-core"},
			Doc: "a published form of the temperature instead of a file", Source: "Vikhlinin et al. 2006",
		},
		{
			Name: "psf_width", Kind: method.Exact, Unit: "kpc", Length: true, Low: 0, High: 1e5,
			Doc: "width of the telescope's point-spread function; annuli narrower than this are told, unless `mixing` is given",
		},
	},
	Blocks: []method.Block{{
		Name: "mixing",
		Doc:  "How the telescope spreads the light of the annuli: one row a pair, annuli numbered from 1 in the order of the temperature file; a pair left out shares nothing.",
		Columns: []method.Column{
			{Name: "from", Required: true, Doc: "annulus that the light comes from"},
			{Name: "into", Required: true, Doc: "annulus whose spectrum it ends in"},
			{Name: "share", Required: true, Doc: "share of the light of the first that ends in the second"},
		},
	}},
}
