package xray

import (
	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// Probe is the X-ray probe.
var Probe = estimate.Probe{
	Name:   "xray",
	Doc:    "Hot gas in hydrostatic equilibrium: its density and temperature give the mass that holds it.",
	Blocks: []method.Block{densityBlock, temperatureBlock},
	Reductions: []estimate.Reduction{
		{Name: "density", Version: 1, From: []string{"density"}, Run: reduceDensity},
		{Name: "temperature", Version: 1, From: []string{"temperature"}, Run: reduceTemperature},
	},
	Methods: []estimate.Method{backward},
}

var backward = estimate.Method{
	Declaration: method.Declaration{
		Name:    "backward",
		Version: 1,
		Summary: "Puts gas of the measured density in hydrostatic equilibrium in a mass model and compares the temperatures with the spectra.",
		Equation: "n_e kT(r) = p_e + ∫ from r to r_e of μ m_p (1 − f) n_e G M(<r′)/r′² dr′,   p_e = η × the weight of the gas beyond r_e\n" +
			"kT of a bin = ∫ n² T^(1/4) dV / ∫ n² T^(−3/4) dV along the whole line of sight, divided by temperature_scale",
		Sources: []string{"Ettori et al. 2010", "Ettori et al. 2013", "Mazzotta et al. 2004", "Vikhlinin et al. 2006"},
		Data:    [][]string{{"density", "temperature"}},
		Settings: append([]method.Setting{
			{
				Name: "halo", Kind: method.Choice, Choices: []string{"nfw"}, Default: method.Word("nfw"),
				Planned: []string{"einasto", "hernquist", "isothermal", "cored-isothermal"},
				Doc:     "the mass model", Source: "Navarro, Frenk & White 1997",
			},
			{
				Name: "mass", Kind: method.Number, Unit: "solMass", Low: 1e9, High: 1e18,
				Default: method.Distributed(prior.LogUniform(1e12, 1e16)), Doc: "prior on M_200c",
			},
			{
				Name: "concentration", Kind: method.Number, Low: 0.1, High: 100, Relation: relationNames(),
				Default: method.Distributed(prior.LogUniform(1, 20)),
				Doc:     "c_200c; wide by default, for the temperatures measure it themselves; with few bins give a relation",
			},
			{
				Name: "outer_pressure_ratio", Kind: method.Number, Low: 1e-3, High: 1e3,
				Default: method.Distributed(prior.LogUniform(0.1, 10)),
				Doc:     "η, the thermal pressure at the outer edge of the temperatures over the weight of the gas beyond, as the density's form and the mass model continue; 1 where equilibrium holds to infinity",
				Source:  "Ettori et al. 2010 leave this pressure free",
			},
		}, gasAssumptions...),
		Cautions: []string{
			"below 3 keV the spectroscopic-like weight is not calibrated",
			"spectra of the innermost annuli are smeared by the instrument where the annuli are narrower than its point-spread function; nothing corrects for it here",
			"spherical symmetry and equilibrium are assumed: what a merger or a cool core in motion does is the intrinsic scatter's part",
		},
	},
	Uses: []string{"density", "temperature"},
	Run:  runBackward,
}

// gasAssumptions are those of every hydrostatic method.
var gasAssumptions = []method.Setting{
	{
		Name: "temperature_scale", Kind: method.Number, Low: 0.2, High: 5, Default: method.Exactly(1),
		Doc: "T_quoted = T_true / scale: 1.12 means that the true gas is 12% hotter than quoted; data and errors stay as they are",
	},
	{
		Name: "temperature_scatter", Kind: method.Number, Low: 0, High: 1,
		Default: method.Distributed(prior.HalfNormal(0.05)),
		Doc:     "fractional scatter of spectral temperatures about the model beyond their quoted errors, added in quadrature; 0 switches it off",
		Source:  "common practice, no source",
	},
	{
		Name: "nonthermal_fraction", Kind: method.Number, Low: 0, High: 0.95, Default: method.Exactly(0),
		Doc: "constant share f = P_nt/(P_th + P_nt) of the pressure that is not thermal: M = M_th/(1 − f)",
	},
	{
		Name: "mean_molecular_weight", Kind: method.Number, Low: 0.5, High: 1.3, Default: method.Exactly(0.6),
		Doc: "μ of the gas, in proton masses: 0.595 to 0.61 for a third of solar metals, by the abundance table",
	},
	{
		Name: "intrinsic_scatter", Kind: method.Number, Low: 0, High: 2, Default: method.Exactly(0.1),
		Doc:    "scatter of ln M about the spherical truth that no other assumption carries",
		Source: "Nagai, Vikhlinin & Kravtsov 2007 (simulated clusters; from memory)",
	},
}

func relationNames() []string {
	var names []string
	for _, r := range halo.Relations() {
		names = append(names, r.Name)
	}
	return names
}
