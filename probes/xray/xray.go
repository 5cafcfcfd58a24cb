// Package xray weighs an object by its hot gas: from the density and the
// temperature of gas in hydrostatic equilibrium follows the mass that holds it.
//
// A density profile is fitted by a published form (Form, Gas); temperatures are
// kept as they are (Spectra). The method `backward` puts the gas in equilibrium
// in a mass model and predicts the temperatures that spectra would yield; the
// prediction is all in atmosphere.
//
// Radii are in kpc, masses in Msun, temperatures kT in keV, electron densities
// in cm⁻³ and pressures, of the electrons alone, in keV cm⁻³.
package xray
