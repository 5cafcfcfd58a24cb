package dynamics

import (
	"context"
	"fmt"
	"math"

	"steelyard/probes/constants"
	"steelyard/probes/estimate"
	"steelyard/probes/infer"
	"steelyard/probes/method"
)

// projectedMass is the estimator of Heisler, Tremaine & Bahcall 1985.
var projectedMass = estimate.Method{
	Declaration: method.Declaration{
		Name:    "projected-mass",
		Version: 1,
		Summary: "Mass inside the radius of the outermost galaxy, from the mean of v²R about the centre.",
		Equation: "M = f/(G (N − 3/2)) Σ v² R,  f = (64/π)(2 − β)/(4 − 3β)\n" +
			"32/π for isotropic and 64/π for radial orbits; redshift errors removed from each v²",
		Sources: []string{"Heisler, Tremaine & Bahcall 1985, ApJ 298, 8", "Bahcall & Tremaine 1981, ApJ 244, 805"},
		Data:    [][]string{{"galaxies"}},
		Settings: []method.Setting{
			massSetting, dispersionSetting, fitWithin,
			{
				Name: "anisotropy", Kind: method.Number, Default: method.Exactly(0), Low: -3, High: 1,
				Doc:    "β = 1 − σ_t²/σ_r² of the orbits, the same everywhere",
				Source: "isotropic by default: Heisler, Tremaine & Bahcall 1985, ApJ 298, 8",
			},
			velocityBias, elongation, concentration,
			{
				Name: "intrinsic_scatter", Kind: method.Number, Default: method.Exactly(0.2), Low: 0, High: 2,
				Doc:    "scatter of ln M about the spherical truth",
				Source: "as for virial",
			},
		},
		Cautions: []string{
			"The mean of v²R hangs on the outermost galaxies: interlopers raise it more than they raise a dispersion.",
			"No correction is made for the system's going on beyond the aperture.",
		},
		Measured: "On isotropic NFW haloes in equilibrium (100 mocks each, quoted error alone): ln M off by +0.45 to +0.73, intervals of 68% hold the truth in 0 to 17%, " +
			"for no surface-pressure correction is made; with field galaxies mixed in up to +1.2. The bias is not taken out. " +
			"STEELYARD_SLOW=1 go test -v -run TestMeasuredBias ./probes/dynamics",
	},
	Uses: []string{"members"},
	Run:  runProjected,
}

// ProjectedMass is f/(G (N − 3/2)) Σ v² R in Msun for velocities in km/s about
// their mean and radii in kpc about the centre, with the f of the anisotropy.
func ProjectedMass(velocities, radii []float64, anisotropy float64) float64 {
	sum := 0.0
	for i, v := range velocities {
		sum += v * v * radii[i]
	}
	return orbitFactor(anisotropy) / constants.G * sum / (float64(len(velocities)) - 1.5)
}

// orbitFactor is f. It follows from ⟨r σ_r²⟩ (4 − 2β) = GM of the Jeans equation
// and ⟨sin θ (1 − β sin²θ)⟩ = (π/4)(1 − 3β/4) over directions, doubled for a mass
// that the galaxies share instead of circling it (Heisler, Tremaine & Bahcall
// 1985, table 1, for β = 0 and 1).
func orbitFactor(beta float64) float64 { return 64 / math.Pi * (2 - beta) / (4 - 3*beta) }

func runProjected(ctx context.Context, t *estimate.Task) (*infer.Draws, error) {
	s, err := readSample(t)
	if err != nil {
		return nil, err
	}
	if v := t.Settings["fit_within"]; v.Set && v.Numbers[0] > 0 {
		return nil, t.Errorf("the projected mass is that of all galaxies inside a radius: fit_within must start at 0")
	}
	sum, psi := 0.0, make([]float64, len(s.galaxies))
	for i, g := range s.galaxies {
		e := constants.SpeedOfLight * g.Error / (1 + s.list.Redshift)
		psi[i] = (g.Velocity*g.Velocity - e*e) * g.Radius
		sum += psi[i]
	}
	if sum <= 0 {
		return nil, t.Errorf("%s: the redshift errors exceed the motions of the galaxies", s.list.File)
	}
	for i := range psi {
		psi[i] /= sum
	}
	obs, err := s.observe(ctx, t, psi)
	if err != nil {
		return nil, err
	}
	a, err := assume(t, obs)
	if err != nil {
		return nil, err
	}
	beta := a.parameters.Assume(t.Settings, "anisotropy")
	aperture, scale := s.farthest(), sum/(float64(len(psi))-1.5)/constants.G
	drawn, err := a.draw(t, obs, func(i int, theta []float64) (m200, c float64) {
		// A resample's Σ v²R is (1 + linear) times the sample's; as with the
		// dispersion its inverse stands for the truth.
		b := a.bias.Of(theta)
		mass := orbitFactor(beta.Of(theta)) * scale / (1 + obs.linear[i]) / (b * b) /
			math.Pow(a.elongation.Of(theta), varianceElongation+radiusElongation)
		if !(mass > 0) || beta.Of(theta) > 1 {
			return 0, 0
		}
		return a.through(t, mass, aperture, theta)
	})
	if err != nil {
		return nil, err
	}
	task, scatter := withScatter(t, 0.2, "")
	return finish(task, s, estimate.Fit{
		Sample: drawn, Parameters: &a.parameters, LnMass: a.lnMass,
		Covers: [2]float64{aperture, aperture},
		Assumes: append(obs.assumes,
			fmt.Sprintf("mass inside %.0f kpc, the outermost galaxy's radius, about the object's centre", aperture), scatter, a.concentrationLine(t)),
		Checks:   obs.checks,
		Warnings: obs.warnings,
	})
}
