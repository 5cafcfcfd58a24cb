package lensing

import (
	"context"
	"fmt"
	"math"

	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// The settings that state an Einstein radius.
var (
	ringRadiusSetting = method.Setting{
		Name: "radius", Kind: method.Measured, Unit: "kpc", Length: true, Required: true,
		Doc: "Einstein radius with its error, about the centre of the halo",
	}
	ringRedshiftSetting = method.Setting{
		Name: "source_redshift", Kind: method.Exact, Required: true, Low: 1e-6, High: farthest,
		Doc: "redshift of the source that is drawn out to the ring or arc",
	}
)

// einsteinRadiusMethod weighs what an Einstein ring encloses.
var einsteinRadiusMethod = estimate.Method{
	Declaration: method.Declaration{
		Name:    "einstein-radius",
		Version: 1,
		Summary: "Weighs the cylinder inside an Einstein radius and makes it spherical along a halo of stated shape.",
		Equation: "M_projected(<θ_E) = π θ_E² D_l² Σ_cr: the mean surface density inside the radius is critical\n" +
			"spherical masses follow from the halo, its projected mass multiplied by `elongation`",
		Sources: []string{"Schneider, Ehlers & Falco 1992, Gravitational Lenses, §8.1 (from memory)"},
		Settings: append(haloSettings[:len(haloSettings):len(haloSettings)],
			ringRadiusSetting, ringRedshiftSetting, distanceScaleSetting, elongationSetting),
		Cautions: []string{
			"The radius measures the mass of a cylinder and nothing else: masses elsewhere, and any sphere's, rest on the halo's shape, `concentration` above all.",
			"Arcs of an elliptical lens do not lie at its Einstein radius: give the radius of the circle that holds the same critical area, with an error that covers what is not known of it.",
		},
	},
	Run: func(ctx context.Context, t *estimate.Task) (*infer.Draws, error) {
		f, err := newLensFit(t)
		if err != nil {
			return nil, err
		}
		if err := f.addRing(); err != nil {
			return nil, err
		}
		return f.run(ctx)
	},
}

// ringPart holds a halo to an Einstein radius.
type ringPart struct {
	fit      *lensFit
	radius   prior.Prior // kpc
	redshift float64     // of the source
	critical float64     // Σ_cr of the source, Msun/kpc²
}

// addRing adds the Einstein radius that the task's settings state.
func (f *lensFit) addRing() error {
	t := f.task
	v, z := t.Settings["radius"], t.Settings["source_redshift"].Prior.A
	switch {
	case v.Prior.IsExact():
		return t.Errorf("radius: an Einstein radius needs an error: radius = \"18.4 +- 0.6 arcsec\"")
	case !(v.Prior.Median() > 0):
		return t.Errorf("radius: an Einstein radius of %.4g kpc is not above zero", v.Prior.Median())
	case z <= t.Object.Redshift:
		return t.Errorf("source_redshift: the source at redshift %g lies in front of the lens at redshift %g", z, t.Object.Redshift)
	}
	f.parts = append(f.parts, &ringPart{f, v.Prior, z, t.Cosmology.SigmaCritical(t.Object.Redshift, z)})
	return nil
}

// einsteinRadius is the radius in kpc inside which the mean surface density of
// the lens is critical for the source, 0 when it is smaller than a parsec.
func (r *ringPart) einsteinRadius(l lens) float64 {
	return meanSurfaceRadius(l.Model, r.critical/(l.elongation*l.distance))
}

// meanSurfaceRadius returns the radius in kpc inside which the model's mean
// surface density is sigma, Msun/kpc²: by Newton's steps in ln R, for which
// d ln(mean Σ)/d ln R = −2 (1 − Σ/mean Σ), kept inside a bracket. It is 0 below
// a parsec and infinite beyond 100 Mpc.
func meanSurfaceRadius(m halo.Model, sigma float64) float64 {
	lo, hi := math.Log(1e-3), math.Log(1e5)
	if _, mean := halo.Projected(m, math.Exp(lo)); !(mean > sigma) {
		return 0
	}
	if _, mean := halo.Projected(m, math.Exp(hi)); mean > sigma {
		return math.Inf(1)
	}
	x := math.Log(100)
	for range 100 {
		surface, mean := halo.Projected(m, math.Exp(x))
		f := math.Log(mean / sigma)
		if f > 0 {
			lo = x
		} else {
			hi = x
		}
		next := x + f*mean/(2*(mean-surface))
		if !(next > lo && next < hi) {
			next = (lo + hi) / 2
		}
		if math.Abs(next-x) < 1e-13 {
			return math.Exp(next)
		}
		x = next
	}
	return math.Exp(x)
}

// likelihood is that of the radius, two-sided where its error is: the score of
// the model's radius in the distribution that was quoted.
func (r *ringPart) likelihood() func(lens) float64 {
	return func(l lens) float64 {
		radius := r.einsteinRadius(l)
		if math.IsInf(radius, 1) {
			return math.Inf(-1)
		}
		s := r.radius.Score(radius)
		return -s*s/2 - math.Log(r.radius.SD()) - math.Log(2*math.Pi)/2
	}
}

func (r *ringPart) state(best lens, fit *estimate.Fit) {
	radius := r.einsteinRadius(best)
	s := r.radius.Score(radius)
	fit.Chi2 += s * s
	fit.Dof++
	measured := r.radius.Median()
	cover(fit, measured, measured)
	fit.Assumes = append(fit.Assumes, fmt.Sprintf("Einstein radius: %.4g +%.2g -%.2g kpc, of a source at redshift %g",
		measured, r.radius.FromScore(1)-measured, measured-r.radius.FromScore(-1), r.redshift))
	fit.Derived = append(fit.Derived, estimate.Derived{Name: "projected_mass", Unit: "solMass", Of: r.projectedMass})
}

// projectedMass is the mass in Msun of the cylinder inside the lens's own
// Einstein radius, M = π R_E² Σ_cr.
func (r *ringPart) projectedMass(theta []float64) float64 {
	l, _ := r.fit.at(theta)
	radius := r.einsteinRadius(l)
	return math.Pi * radius * radius * r.critical / l.distance
}
