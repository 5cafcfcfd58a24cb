// Package halo holds spherical mass models, their mass definitions and the
// published relations between mass and concentration.
//
// A Model gives every quantity an estimator asks of a mass distribution; each
// model is a small value in a file of its own. Definition, RadiusAt and Convert
// turn one mass definition into another by finding the radius at which the mean
// density is right, for any model.
//
// Units: kpc (physical), Msun, Msun/kpc³, Msun/kpc², km/s. Projected quantities
// have an infinite line of sight. Radii must be positive; parameters of the
// models must be positive too. Neither is checked: what is computed from a
// parameter that makes no sense is NaN or makes no sense.
package halo

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

// Projected returns Σ(R) and its mean inside R. For models that can, it computes
// both at little more than the price of one.
func Projected(m Model, R float64) (surface, mean float64) {
	if p, ok := m.(interface {
		Projected(R float64) (surface, mean float64)
	}); ok {
		return p.Projected(R)
	}
	return m.SurfaceDensity(R), m.MeanSurfaceDensity(R)
}
