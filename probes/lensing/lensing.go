// Package lensing weighs an object by the light it bends.
//
// Start at Probe, which declares the data blocks, the reductions and the
// methods. A shape catalogue (galaxies.go) or a published profile
// (published.go) becomes a Profile, a list of multiple images becomes families
// (images.go); a method fits a halo to them.
//
// Conventions, held everywhere in the package:
//
//   - κ and γ are for the surface density Σ and the excess ΔΣ of the lens in
//     units of the critical surface density of a source at infinity. A source's
//     efficiency β = (D_ls/D_s)/(D_ls/D_s)_∞ multiplies both. A source that is
//     not behind the lens has β = 0 and stays in every average.
//   - The ellipticity is ε = (a−b)/(a+b), whose mean over randomly oriented
//     sources is the reduced shear g = γ/(1−κ) (Seitz & Schneider 1997, A&A
//     318, 687), and 1/g where |g| > 1.
//   - Tangential and cross components are e_t = −(e1 cos 2φ + e2 sin 2φ) and
//     e_x = e1 sin 2φ − e2 cos 2φ, φ the direction from the centre to the
//     galaxy, counted from east towards north at the galaxy.
package lensing

import "steelyard/probes/estimate"

// Probe is what a `lensing` block of a recipe can declare.
var Probe = estimate.Probe{
	Name:       "lensing",
	Doc:        "Weighs an object by the shapes and places of the galaxies behind it.",
	Blocks:     blocks,
	Reductions: []estimate.Reduction{profileReduction, imagesReduction},
	Methods:    []estimate.Method{tangentialShear, aperture, einsteinRadiusMethod, imagePositions, combined},
}
