package recipes

import (
	"math"

	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// testProbes stands for the probes of the program: small, but with every kind
// of setting, column and block that a declaration can have.
var testProbes = []method.Probe{
	{
		Name: "xray",
		Blocks: []method.Block{
			{
				Name: "density", Doc: "The electron density in shells.", FileOptional: true,
				Columns: profileColumns("cm**-3"), Alternatives: profileSets(),
				Settings: []method.Setting{
					{Name: "model", Kind: method.Choice, Choices: []string{"beta"}, Planned: []string{"double-beta", "modified-beta"}},
					{Name: "n0", Kind: method.Exact, Unit: "cm**-3", Low: 0, High: 10},
					{Name: "rc", Kind: method.Exact, Unit: "kpc", Length: true, Low: 0, High: 1e4},
					{Name: "beta", Kind: method.Exact, Low: 0.1, High: 5},
				},
			},
			{
				Name: "temperature", Doc: "The temperature in annuli.",
				Columns: profileColumns("keV"), Alternatives: profileSets(),
				Settings: []method.Setting{{Name: "projected", Kind: method.Flag, Default: method.Value{Set: true, Flag: true}}},
			},
		},
		Methods: []method.Declaration{
			{
				Name: "backward", Version: 1, Data: [][]string{{"density", "temperature"}},
				Settings: []method.Setting{
					{Name: "halo", Kind: method.Choice, Choices: []string{"nfw"}, Planned: []string{"einasto", "hernquist"}, Default: method.Word("nfw")},
					massSetting, concentrationSetting,
					{Name: "temperature_scale", Kind: method.Number, Low: 0.2, High: 5, Default: method.Exactly(1)},
					{Name: "temperature_scatter", Kind: method.Number, Low: 0, High: 1, Default: method.Distributed(prior.HalfNormal(0.05))},
					{Name: "fit_within", Kind: method.Span, Unit: "kpc", Length: true},
				},
			},
			{
				Name: "gas-only", Version: 1, Data: [][]string{{"density"}},
				Settings: []method.Setting{{Name: "clumping", Kind: method.Number, Low: 1, High: 10, Default: method.Exactly(1)}},
			},
		},
	},
	{
		Name: "lensing",
		Blocks: []method.Block{
			{
				Name: "galaxies", Doc: "A catalogue of galaxy shapes.", Select: true,
				Columns: []method.Column{
					{Name: "ra", Unit: "rad", Required: true, Doc: "right ascension, ICRS"}, {Name: "dec", Unit: "rad", Required: true, Doc: "declination, ICRS"},
					{Name: "e1", Required: true, Doc: "ellipticity along the axes"}, {Name: "e2", Required: true, Doc: "ellipticity along the diagonals"},
					{Name: "weight"}, {Name: "redshift"}, {Name: "family", Text: true},
				},
				Settings: []method.Setting{
					{Name: "handedness", Kind: method.Choice, Choices: []string{"east", "west"}, Default: method.Word("east")},
					sourceRedshiftSetting,
				},
				Blocks: []method.Block{sourcesBlock},
			},
			{
				Name: "bins", Doc: "The radial bins.",
				Settings: []method.Setting{
					{Name: "from", Kind: method.Exact, Unit: "kpc", Length: true, Required: true, Doc: "inner edge of the first bin"},
					{Name: "to", Kind: method.Exact, Unit: "kpc", Length: true, Required: true, Doc: "outer edge of the last bin"},
					{Name: "count", Kind: method.Integer, Low: 3, High: 1000, Default: method.Exactly(10)},
					{Name: "edges", Kind: method.List, Unit: "kpc", Length: true},
				},
			},
			{
				Name: "profile", Doc: "A binned profile of the tangential reduced shear.",
				Columns: profileColumns(""), Alternatives: profileSets(), Settings: []method.Setting{sourceRedshiftSetting}, Blocks: []method.Block{sourcesBlock},
			},
		},
		Methods: []method.Declaration{
			{
				Name: "tangential-shear", Version: 1, Data: [][]string{{"profile"}, {"galaxies", "bins"}},
				Settings: []method.Setting{
					{Name: "halo", Kind: method.Choice, Choices: []string{"nfw", "isothermal"}, Planned: []string{"einasto"}, Required: true, Doc: "the mass model to fit"},
					massSetting, concentrationSetting,
					{Name: "shear_bias", Kind: method.Number, Low: -0.5, High: 0.5, Default: method.Exactly(0)},
					{Name: "elongation", Kind: method.Number, Low: 0.1, High: 10, Default: method.Exactly(1)},
					{Name: "miscentring", Kind: method.Number, Unit: "kpc", Length: true, Low: 0, High: 2000, Default: method.Exactly(0)},
					{Name: "covariance", Kind: method.Choices, Required: true, Choices: []string{"shape"}, Planned: []string{"structure", "halo"}, Doc: "which sources of error enter"},
					{Name: "fit_within", Kind: method.Span, Unit: "kpc", Length: true},
				},
			},
			{
				Name: "ring", Version: 1,
				Settings: []method.Setting{
					{Name: "radius", Kind: method.Measured, Unit: "kpc", Length: true, Required: true, Low: 0, High: math.Inf(1), Doc: "the Einstein radius"},
					sourceRedshiftSetting,
				},
			},
		},
	},
	{
		Name: "dynamics",
		Blocks: []method.Block{
			{
				Name: "galaxies", Doc: "A redshift catalogue.", Select: true,
				Columns: []method.Column{
					{Name: "ra", Unit: "rad", Required: true}, {Name: "dec", Unit: "rad", Required: true},
					{Name: "redshift", Required: true, Doc: "redshift of the galaxy"}, {Name: "error"},
				},
			},
			{Name: "members", Doc: "How members are told from interlopers.", Settings: []method.Setting{
				{Name: "method", Kind: method.Choice, Choices: []string{"given", "sigma-clip", "shifting-gapper"}, Required: true},
			}},
			{Name: "dispersion", Doc: "One quoted velocity dispersion.", Settings: []method.Setting{
				{Name: "value", Kind: method.Measured, Unit: "km/s", Required: true, Low: 1, High: 1e4},
				{Name: "within", Kind: method.Exact, Unit: "kpc", Length: true},
				{Name: "members", Kind: method.Integer, Low: 3, High: 1e6},
			}},
		},
		Methods: []method.Declaration{
			{
				Name: "dispersion-scaling", Version: 1, Data: [][]string{{"galaxies", "members"}, {"dispersion"}},
				Settings: []method.Setting{
					{Name: "scaling", Kind: method.Choice, Choices: []string{"evrard-2008", "munari-2013"}, Default: method.Word("munari-2013")},
					{Name: "velocity_bias", Kind: method.Number, Low: 0.2, High: 5, Default: method.Exactly(1)},
					{Name: "overdensity", Kind: method.Overdensity, Default: method.Value{Set: true, Prior: prior.Exact(200), Text: "critical"}},
					{Name: "note", Kind: method.Text},
					concentrationSetting,
				},
			},
		},
	},
}

var (
	massSetting           = method.Setting{Name: "mass", Kind: method.Number, Unit: "solMass", Low: 1e8, High: 1e18, Default: method.Distributed(prior.LogUniform(1e12, 1e16))}
	concentrationSetting  = method.Setting{Name: "concentration", Kind: method.Number, Low: 0.1, High: 100, Relation: []string{"duffy-2008", "dutton-maccio-2014"}, Planned: []string{"bhattacharya-2013"}, Default: method.Related("duffy-2008")}
	sourceRedshiftSetting = method.Setting{Name: "source_redshift", Kind: method.Exact, Low: 1e-6, High: 1100}
	sourcesBlock          = method.Block{Name: "sources", Doc: "The redshift distribution of the sources.", Columns: []method.Column{{Name: "redshift", Required: true}, {Name: "weight"}}}
)

func profileColumns(unit string) []method.Column {
	columns := []method.Column{
		{Name: "inner", Unit: "kpc", Length: true}, {Name: "outer", Unit: "kpc", Length: true},
		{Name: "radius", Unit: "kpc", Length: true}, {Name: "half_width", Unit: "kpc", Length: true},
		{Name: "value", Unit: unit, Required: true, Doc: "the value in each bin"},
	}
	for _, name := range []string{"error", "minus", "plus", "low", "high"} {
		columns = append(columns, method.Column{Name: name, Unit: unit})
	}
	return columns
}

func profileSets() [][][]string {
	return [][][]string{{{"inner", "outer"}, {"radius", "half_width"}}, {{"error"}, {"minus", "plus"}, {"low", "high"}}}
}
