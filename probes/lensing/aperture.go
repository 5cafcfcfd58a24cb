package lensing

import (
	"context"
	"fmt"
	"math"
	"slices"

	"steelyard/probes/estimate"
	"steelyard/probes/infer"
	"steelyard/probes/method"
)

// aperture weighs a cylinder by the shear around it.
var aperture = estimate.Method{
	Declaration: method.Declaration{
		Name:    "aperture",
		Version: 1,
		Summary: "Weighs a cylinder by the shear outside it, and makes it spherical along a halo of stated shape.",
		Equation: "ζ_c = 2 ∫ γ_t d ln R from R1 to R2 + 2/(1 − R2²/R3²) ∫ γ_t d ln R from R2 to R3 = mean κ(<R1) − mean κ(R2 to R3)\n" +
			"M_projected(<R1) = π R1² Σ_cr (ζ_c + mean κ(R2 to R3)), γ = g (1 − κ) by iteration",
		Sources: []string{
			"Fahlman et al. 1994, ApJ 437, 56",
			"Clowe et al. 1998, ApJ 497, L61",
		},
		Data: [][]string{{"galaxies", "bins"}, {"profile"}},
		Settings: slices.Concat(haloSettings, termSettings, []method.Setting{
			{
				Name: "radius", Kind: method.Exact, Unit: "kpc", Length: true, Required: true,
				Doc: "R1, the radius of the cylinder; the bins used begin at the first edge not inside it",
			},
			{
				Name: "control", Kind: method.Span, Unit: "kpc", Length: true, Required: true,
				Doc: "R2 and R3, the control annulus",
			},
			shearBiasSetting, dilutionSetting, distanceScaleSetting, elongationSetting, miscentringSetting,
		}),
		Cautions: []string{
			"ζ_c alone is a lower bound: it lacks the mean convergence of the control annulus, which is taken along the halo, and printed.",
			"One number is measured. The mass at other radii, and any sphere's, rest on the halo's shape.",
		},
	},
	Uses: []string{"profile"},
	Run: func(ctx context.Context, t *estimate.Task) (*infer.Draws, error) {
		f, err := newLensFit(t)
		if err != nil {
			return nil, err
		}
		if err := f.addAperture(); err != nil {
			return nil, err
		}
		return f.run(ctx)
	},
}

// aperturePart holds a halo to one weighted sum of the shears, A = Σ a_i g_i,
// which is ζ_c but for the step from g to γ. The halo's own A goes through the
// same bins and the same reduced shear, so that nothing of that step is left.
type aperturePart struct {
	*shearPart
	fit                  *lensFit
	inner, outer, around float64   // R1, R2, R3 in kpc
	weights              []float64 // a_i
}

// addAperture adds the aperture that the task's settings state.
func (f *lensFit) addAperture() error {
	t := f.task
	span := t.Settings["control"].Numbers
	inner := t.Settings["radius"].Prior.A
	if len(span) != 2 || !(0 < inner && inner < span[0] && span[0] < span[1]) {
		return t.Errorf("the control annulus %.4g kpc must begin beyond the cylinder's radius of %.4g kpc, and end beyond that", span, inner)
	}
	p, err := f.readShear()
	if err != nil {
		return err
	}
	if p.Bins[0].Inner == p.Bins[0].Outer {
		return t.Errorf("the shear is given at radii without bins, and ζ_c is an integral over bins: give `inner` and `outer`")
	}
	first, end := 0, len(p.Bins)
	const rounding = 1e-9
	for first < end && p.Bins[first].Inner < inner*(1-rounding) {
		first++
	}
	for end > first && p.Bins[end-1].Outer > span[1]*(1+rounding) {
		end--
	}
	if end-first < fewest {
		return t.Errorf("%d bins lie between the cylinder's radius of %.4g kpc and the end of the control annulus at %.4g kpc; at least %d are needed", end-first, inner, span[1], fewest)
	}
	shear, err := f.newShear(p.slice(first, end))
	if err != nil {
		return err
	}
	bins := shear.profile.Bins
	a := &aperturePart{shearPart: shear, fit: f, inner: bins[0].Inner, around: bins[len(bins)-1].Outer}
	// The control annulus begins at the edge nearest to where it was asked to.
	split := 1
	for i := 2; i < len(bins); i++ {
		if math.Abs(math.Log(bins[i].Inner/span[0])) < math.Abs(math.Log(bins[split].Inner/span[0])) {
			split = i
		}
	}
	a.outer = bins[split].Inner
	for i, b := range bins {
		if i > 0 && b.Inner > bins[i-1].Outer*(1+1e-6) {
			return t.Errorf("there is no shear between %.4g and %.4g kpc, and ζ_c is an integral without gaps", bins[i-1].Outer, b.Inner)
		}
		w := 2 * math.Log(b.Outer/b.Inner)
		if i >= split {
			w /= 1 - a.outer*a.outer/(a.around*a.around)
		}
		a.weights = append(a.weights, w)
	}
	f.parts = append(f.parts, a)
	return nil
}

// sum is A of the shears.
func (a *aperturePart) sum(shears []float64) float64 {
	s := 0.0
	for i, w := range a.weights {
		s += w * shears[i]
	}
	return s
}

// measured is A of the data, with the squares of its errors below and above by
// the bins' own errors, or both by their covariance.
func (a *aperturePart) measured() (sum, minus2, plus2 float64) {
	n := len(a.weights)
	for i, b := range a.profile.Bins {
		sum += a.weights[i] * b.Shear
		if a.measure.given == nil {
			minus2 += math.Pow(a.weights[i]*b.Minus, 2)
			plus2 += math.Pow(a.weights[i]*b.Plus, 2)
		}
	}
	for _, c := range [][]float64{a.measure.given, a.measure.added} {
		for k, v := range c {
			v *= a.weights[k/n] * a.weights[k%n]
			minus2, plus2 = minus2+v, plus2+v
		}
	}
	return sum, minus2, plus2
}

func (a *aperturePart) likelihood() func(lens) float64 {
	n := len(a.weights)
	datum, minus2, plus2 := a.measured()
	expected := make([]float64, n)
	room := [][]float64{make([]float64, n), make([]float64, n)}
	return func(l lens) float64 {
		a.predict(l, expected)
		d := a.sum(expected) - datum
		variance := minus2
		if d > 0 {
			variance = plus2
		}
		if a.variety != nil {
			for _, mode := range a.variety.modes(l, a.halo, expected, a.predict, room) {
				s := a.sum(mode)
				variance += s * s
			}
		}
		return -d*d/(2*variance) - math.Log(2*math.Pi*variance)/2 + a.offset.lnDensity(l.theta)
	}
}

func (a *aperturePart) state(best lens, fit *estimate.Fit) {
	expected := make([]float64, len(a.weights))
	a.predict(best, expected)
	datum, minus2, plus2 := a.measured()
	d := a.sum(expected) - datum
	fit.Chi2 += d * d / ((minus2 + plus2) / 2)
	fit.Dof++
	cover(fit, a.inner, a.inner)
	checks, warnings := a.profile.checks(expected)
	fit.Checks, fit.Warnings = append(fit.Checks, checks...), append(fit.Warnings, warnings...)
	fit.Assumes = append(fit.Assumes, a.assumes()...)
	control := a.controlConvergence(best)
	zeta, sd := a.zeta(control, best), math.Sqrt((minus2+plus2)/2)
	area := math.Pi * a.inner * a.inner * a.criticalOfMean()
	fit.Assumes = append(fit.Assumes,
		fmt.Sprintf("ζ_c = %.4f ± %.4f inside %.4g kpc: alone a lower bound of %.3g Msun on that cylinder", zeta, sd, a.inner, area*zeta),
		fmt.Sprintf("control annulus: %.4g to %.4g kpc, where the best halo has a mean convergence of %.4f", a.outer, a.around, control))
	fit.Derived = append(fit.Derived, estimate.Derived{Name: "projected_mass", Unit: "solMass", Of: func(theta []float64) float64 {
		l, _ := a.fit.at(theta)
		return l.elongation * l.ProjectedMass(a.inner)
	}})
}

// criticalOfMean is Σ_cr of the bins' mean efficiency.
func (a *aperturePart) criticalOfMean() float64 { return a.critical / meanBeta(a.profile.Bins) }

// controlConvergence is the halo's mean convergence in the control annulus.
func (a *aperturePart) controlConvergence(l lens) float64 {
	mass := l.ProjectedMass(a.around) - l.ProjectedMass(a.outer)
	return l.elongation * l.distance * mass / (math.Pi * (a.around*a.around - a.outer*a.outer)) / a.criticalOfMean()
}

// zeta is ζ_c of the data, γ = g (1 − κ) found by iteration: in the control
// annulus κ is its mean, and inside it
//
//	κ(R) = mean κ(<R) − γ(R),   mean κ(<R) = ζ_c(R) + mean κ(R2 to R3).
func (a *aperturePart) zeta(control float64, best lens) float64 {
	bins := a.profile.Bins
	response := (1 + a.bias.Of(best.theta)) * (1 - a.dilution.Of(best.theta))
	gamma := make([]float64, len(bins))
	for i, b := range bins {
		gamma[i] = b.Shear / response
	}
	for range 50 {
		outside := 0.0 // ζ_c at the outer edge of bin i
		for i := len(bins) - 1; i >= 0; i-- {
			b, half := bins[i], a.weights[i]*gamma[i]/2
			kappa := control
			if b.Outer <= a.outer*(1+1e-6) {
				kappa = outside + half + control - gamma[i]
			}
			outside += 2 * half
			if b.Beta > 0 {
				gamma[i] = b.Shear / response * (1 - kappa*b.Beta2/(b.Beta*b.Beta))
			}
		}
	}
	return a.sum(gamma)
}
