// Package halo holds spherical mass models and their mass definitions.
package halo

import "steelyard/probes/cosmology"

// Model is a spherical mass distribution. Radii in kpc, masses in Msun,
// densities in Msun/kpc³, surface densities in Msun/kpc², all with an infinite
// line of sight.
type Model interface {
	Density(r float64) float64              // ρ(r)
	Mass(r float64) float64                 // M(<r) in the sphere
	SurfaceDensity(R float64) float64       // Σ(R)
	MeanSurfaceDensity(R float64) float64   // mean Σ inside R
	ExcessSurfaceDensity(R float64) float64 // ΔΣ = mean Σ(<R) − Σ(R)
	ProjectedMass(R float64) float64        // π R² mean Σ(<R)
	Potential(r float64) float64            // (km/s)²; zero at infinity where the mass is finite or falls fast enough
	EscapeSpeed(r float64) float64          // km/s
}

// NFW is the profile of Navarro, Frenk & White 1997.
type NFW struct{ RhoS, Rs float64 }

// NewNFW returns the NFW halo whose mean density inside r_Δ = c·Rs is
// threshold (Msun/kpc³) and whose mass inside r_Δ is mass.
func NewNFW(mass, concentration, threshold float64) NFW { panic("halo: being written") }

// Isothermal is the singular isothermal sphere of one-dimensional dispersion
// Sigma, km/s.
type Isothermal struct{ Sigma float64 }

// NewIsothermal returns the sphere with the given mass at mean density threshold.
func NewIsothermal(mass, threshold float64) Isothermal { panic("halo: being written") }

// Definition is a mass definition: Delta times a reference density.
type Definition struct {
	Delta float64 // ignored for "virial"
	Of    string  // "critical", "mean" or "virial"
}

// Threshold is the mean density inside the radius of the definition, in
// Msun/kpc³; an error for "virial" outside flat ΛCDM.
func (d Definition) Threshold(c *cosmology.Cosmology, z float64) (float64, error) {
	panic("halo: being written")
}

// RadiusAt returns the radius in kpc inside which the model's mean density is
// threshold; an error when there is none.
func RadiusAt(m Model, threshold float64) (float64, error) { panic("halo: being written") }

// Relation is a published concentration–mass relation, for M_200c and c_200c.
type Relation struct {
	Name    string // "duffy-2008"
	Source  string
	Scatter float64 // standard deviation of ln c
	// Low and High bound the masses, in Msun, and MaxRedshift the redshift, for
	// which it was calibrated.
	Low, High, MaxRedshift float64
}

// Relations lists the relations known.
func Relations() []Relation { panic("halo: being written") }

// FindRelation returns the named relation.
func FindRelation(name string) (Relation, bool) { panic("halo: being written") }

// Concentration returns the median c_200c of a halo of mass m200 in Msun.
func (r Relation) Concentration(m200, z float64, c *cosmology.Cosmology) float64 {
	panic("halo: being written")
}
