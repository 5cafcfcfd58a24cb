// Package xray weighs an object by its hot gas: from the density and the
// temperature of gas in hydrostatic equilibrium follows the mass that holds it.
//
// A published form (Form) is fitted to shells of electron density or, projected,
// to a surface brightness; what comes out, with its errors, is a Gas.
// Temperatures are kept as they were measured (Spectra). The methods share a
// fit, which compares temperatures with the spectra and draws the density's
// errors along with the rest:
//
//   - backward puts the gas to rest in a mass model (atmosphere) and predicts the
//     temperatures;
//   - forward fits a form to the temperatures and reads the mass off the slopes;
//   - isothermal-beta is forward with one temperature and a β model.
//
// To add a method, write its file beside these and name it in Probe.
//
// Radii are in kpc, masses in Msun, temperatures kT in keV, electron densities
// in cm⁻³ and pressures, of the electrons alone, in keV cm⁻³.
package xray
