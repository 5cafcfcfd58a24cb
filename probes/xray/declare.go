package xray

import (
	"steelyard/probes/estimate"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// Probe is the X-ray probe.
var Probe = estimate.Probe{
	Name:   "xray",
	Doc:    "Hot gas in hydrostatic equilibrium: its density and temperature give the mass that holds it.",
	Blocks: []method.Block{densityBlock, brightnessBlock, temperatureBlock},
	Reductions: []estimate.Reduction{
		{Name: "density", Version: 2, From: []string{"density?", "surface_brightness?"}, Run: reduceDensity},
		{Name: "temperature", Version: 2, From: []string{"temperature", "temperature.mixing?"}, Run: reduceTemperature},
	},
	Methods: []estimate.Method{backward, forward, isothermalBetaMethod},
}

// gasData are the data blocks of every hydrostatic method.
var gasData = [][]string{{"density", "temperature"}, {"surface_brightness", "temperature"}}

// gasCautions hold for every hydrostatic method.
var gasCautions = []string{
	"below 3 keV the spectroscopic-like weight is not calibrated",
	"the telescope smears annuli that are narrower than its point-spread function into each other: give a mixing matrix, or state psf_width to be told",
	"spherical symmetry and equilibrium are assumed: what a merger or a cool core in motion does is the intrinsic scatter's part",
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
	nonthermalSettings[0], nonthermalSettings[1], nonthermalSettings[2],
	{
		Name: "mean_molecular_weight", Kind: method.Number, Low: 0.5, High: 1.3, Default: method.Exactly(0.6),
		Doc: "μ of the gas, in proton masses: 0.595 to 0.61 for a third of solar metals, by the abundance table",
	},
	{
		Name: "electron_molecular_weight", Kind: method.Number, Low: 1, High: 2, Default: method.Exactly(1.17),
		Doc: "μ_e, the gas's mass per electron in proton masses; it enters the gas mass only",
	},
	{
		Name: "clumping", Kind: method.Number, Low: 1, High: 100, Default: method.Exactly(1),
		Doc: "⟨n²⟩/⟨n⟩² of the gas: a constant one leaves the hydrostatic mass unchanged and lowers the gas mass by its square root",
	},
	{
		Name: "intrinsic_scatter", Kind: method.Number, Low: 0, High: 2, Default: method.Exactly(0.1),
		Doc:    "scatter of ln M about the spherical truth that no other assumption carries",
		Source: "Nagai, Vikhlinin & Kravtsov 2007 (simulated clusters; from memory)",
	},
}
