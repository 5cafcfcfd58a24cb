package estimate

import (
	"fmt"
	"math"

	"steelyard/probes/catalogue"
	"steelyard/probes/infer"
	"steelyard/probes/prior"
)

// Fit is what an estimator hands over once it has drawn its parameters.
type Fit struct {
	Sample     *infer.Sample
	Parameters *Parameters
	// LnMass fills out with ln M(<r), r in kpc and M in Msun, at each of radii.
	LnMass   func(theta, radii, out []float64) error
	Derived  []Derived  // further quantities to report
	Covers   [2]float64 // kpc
	Chi2     float64    // of the best fit
	Dof      int        // 0 when nothing was fitted
	Assumes  []string
	Checks   []infer.Check
	Warnings []string
}

// Derived is a reported quantity that follows from the drawn ones.
type Derived struct {
	Name, Unit string
	Of         func(theta []float64) float64
}

// Errorf returns an error that names the estimate.
func (t *Task) Errorf(format string, args ...any) error {
	return fmt.Errorf("%s: %w", t.Name, fmt.Errorf(format, args...))
}

// Kpc returns a column of lengths in kpc; one that was given as an angle is
// converted with the angular-diameter distance of the object.
func (t *Task) Kpc(c *catalogue.Column) []float64 {
	if c == nil {
		return nil
	}
	if c.Unit != "rad" {
		return c.Values
	}
	distance := t.Cosmology.AngularDiameter(t.Object.Redshift)
	out := make([]float64, len(c.Values))
	for i, angle := range c.Values {
		out[i] = angle * distance
	}
	return out
}

// Finish lays the drawn masses on the grid, adds the intrinsic scatter that the
// estimate's settings ask for, and states what the masses rest on.
func (t *Task) Finish(f Fit) (*infer.Draws, error) {
	n, radii := len(f.Sample.Values), infer.Grid()
	d := &infer.Draws{
		N: n, Radii: radii, LnMass: make([]float64, n*len(radii)), Covers: f.Covers,
		Quality: f.Sample.Quality, Checks: f.Checks,
	}
	for i, theta := range f.Sample.Values {
		row := d.LnMass[i*len(radii) : (i+1)*len(radii)]
		if err := f.LnMass(theta, radii, row); err != nil {
			return nil, err
		}
		for j, v := range row {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				return nil, t.Errorf("the mass inside %.4g kpc is not a positive number in draw %d of %d", radii[j], i+1, n)
			}
		}
	}
	t.columns(d, f)
	shifted := t.scatter(d)
	t.quality(d, f)
	if err := t.restate(d, shifted); err != nil {
		return nil, err
	}
	d.Warnings = append(d.Warnings, piledUp(f)...)
	d.Assumes = append(t.massPrior(), f.Assumes...)
	d.Warnings = append(d.Warnings, f.Sample.Warnings...)
	d.Warnings = append(d.Warnings, f.Warnings...)
	return d, nil
}

// columns copies the drawn parameters, the shared nuisances as prior scores,
// and the derived quantities.
func (t *Task) columns(d *infer.Draws, f Fit) {
	for j, free := range f.Parameters.Free {
		values := make([]float64, d.N)
		for i, theta := range f.Sample.Values {
			values[i] = theta[j]
		}
		if !f.Parameters.hidden[j] {
			d.Parameters = append(d.Parameters, infer.Parameter{Name: free.Name, Unit: free.Unit, Values: values})
		}
		if name := f.Parameters.nuisance[j]; name != "" {
			scores := make([]float64, d.N)
			for i, v := range values {
				scores[i] = free.Prior.Score(v)
			}
			d.Nuisances = append(d.Nuisances, infer.Parameter{Name: name, Values: scores})
		}
	}
	for _, q := range f.Derived {
		values := make([]float64, d.N)
		for i, theta := range f.Sample.Values {
			values[i] = q.Of(theta)
		}
		d.Parameters = append(d.Parameters, infer.Parameter{Name: q.Name, Unit: q.Unit, Values: values})
	}
}

// scatter moves each draw's whole profile by the scatter of ln M about the
// spherical truth that `intrinsic_scatter` states. The data cannot tell this
// scatter from the mass, so it is added after the fit.
func (t *Task) scatter(d *infer.Draws) bool {
	v := t.Settings["intrinsic_scatter"]
	if !v.Set || (v.Prior.IsExact() && v.Prior.A == 0) {
		return false
	}
	rng := t.Sampling.Stream.Sub("intrinsic scatter").Rand(0)
	width, scores := make([]float64, d.N), make([]float64, d.N)
	for i := range width {
		width[i] = v.Prior.A
		if !v.Prior.IsExact() {
			scores[i] = rng.NormFloat64()
			width[i] = v.Prior.FromScore(scores[i])
		}
		shift := width[i] * rng.NormFloat64()
		for j := range d.Radii {
			d.LnMass[i*len(d.Radii)+j] += shift
		}
	}
	if !v.Prior.IsExact() {
		d.Parameters = append(d.Parameters, infer.Parameter{Name: "intrinsic_scatter", Values: width})
	}
	if v.Nuisance != "" {
		d.Nuisances = append(d.Nuisances, infer.Parameter{Name: v.Nuisance, Values: scores})
	}
	return true
}

// restate reads mass_200c off the profiles after they were moved, so that the
// parameter and the masses printed beside it are one number.
func (t *Task) restate(d *infer.Draws, shifted bool) error {
	p := d.Parameter("mass_200c")
	if p == nil || !shifted {
		return nil
	}
	threshold := 200 * t.Cosmology.CriticalDensity(t.Object.Redshift)
	for i := range p.Values {
		r, ok := d.RadiusAt(i, threshold)
		if !ok {
			return t.Errorf("r_200 lies outside %.0f kpc to %.0f kpc in draw %d of %d", d.Radii[0], d.Radii[len(d.Radii)-1], i+1, d.N)
		}
		p.Values[i] = 4 * math.Pi / 3 * threshold * r * r * r
	}
	return nil
}

// quality states how well the best fit fits.
func (t *Task) quality(d *infer.Draws, f Fit) {
	d.Quality.Chi2, d.Quality.Dof, d.Quality.PValue = f.Chi2, f.Dof, 1
	if f.Dof > 0 {
		d.Quality.PValue = infer.ChiSquareP(f.Chi2, f.Dof)
		if d.Quality.PValue < 1e-3 {
			d.Warnings = append(d.Warnings, fmt.Sprintf("poorly fitted: χ² = %.1f for %d degrees of freedom (p %s); its error does not cover what the model misses", f.Chi2, f.Dof, tiny(d.Quality.PValue)))
		}
	}
	p := d.Parameter("mass_200c")
	if _, drawn := t.Settings["mass"]; !drawn || p == nil {
		return
	}
	if m := infer.Percentiles(p.Values, 16, 50, 84); m[1] < 5*(m[2]-m[0])/2 {
		d.Warnings = append(d.Warnings, fmt.Sprintf("the mass is measured at %.1f times its error, below 5: the prior on the mass matters", 2*m[1]/(m[2]-m[0])))
	}
}

// tiny writes a small probability, which may have vanished altogether.
func tiny(p float64) string {
	if p < 1e-99 {
		return "< 1e-99"
	}
	return fmt.Sprintf("= %.1g", p)
}

// piledUp names the parameters that the data push against an end of their prior,
// a third of the draws or more within its outer hundredth: such a value is the
// prior's, not the data's.
func piledUp(f Fit) []string {
	var out []string
	for j, free := range f.Parameters.Free {
		if free.Prior.Kind != prior.UniformKind && free.Prior.Kind != prior.LogUniformKind {
			continue // has no ends to pile up at
		}
		low, high := 0, 0
		for _, theta := range f.Sample.Values {
			switch u := free.Prior.CDF(theta[j]); {
			case u < 0.01:
				low++
			case u > 0.99:
				high++
			}
		}
		for _, end := range []struct {
			name  string
			count int
		}{{"lower", low}, {"upper", high}} {
			if 3*end.count > len(f.Sample.Values) {
				out = append(out, fmt.Sprintf("%s piles up at the %s end of its prior %s: the prior, not the data, decides it", free.Name, end.name, free.Prior))
			}
		}
	}
	return out
}

func (t *Task) massPrior() []string {
	v, ok := t.Settings["mass"]
	if !ok || !v.Set {
		return nil
	}
	return []string{fmt.Sprintf("prior on M_200c: %s Msun", v.Prior)}
}
