package halo

import (
	"fmt"
	"math"
	"strconv"

	"steelyard/probes/cosmology"
)

// Definition is a mass definition: Delta times a reference density.
type Definition struct {
	Delta float64 // ignored for "virial"
	Of    string  // "critical", "mean" or "virial"
}

// String is the usual short name: "500c", "200m", "virial".
func (d Definition) String() string {
	if d.Of == "critical" || d.Of == "mean" {
		return strconv.FormatFloat(d.Delta, 'g', -1, 64) + d.Of[:1]
	}
	return d.Of
}

// Threshold is the mean density inside the radius of the definition, in
// Msun/kpc³; an error for "virial" outside flat ΛCDM.
func (d Definition) Threshold(c *cosmology.Cosmology, z float64) (float64, error) {
	delta := d.Delta
	reference := c.CriticalDensity(z)
	switch d.Of {
	case "critical":
	case "mean":
		reference = c.MeanDensity(z)
	case "virial":
		var err error
		if delta, err = c.VirialOverdensity(z); err != nil {
			return 0, err
		}
	default:
		return 0, fmt.Errorf(`halo: a mass is defined relative to "critical", "mean" or "virial", not %q`, d.Of)
	}
	if !(delta > 0) || math.IsInf(delta, 1) {
		return 0, fmt.Errorf("halo: the overdensity %g is not a positive number", delta)
	}
	return delta * reference, nil
}

// sphereRadius is the radius of a sphere of that mass and mean density.
func sphereRadius(mass, density float64) float64 {
	return math.Cbrt(3 * mass / (4 * math.Pi * density))
}

// The radii in kpc between which RadiusAt looks.
const (
	smallestRadius = 1e-6
	largestRadius  = 1e8
)

// RadiusAt returns the radius in kpc inside which the model's mean density is
// threshold; an error when there is none between 1e-6 and 1e8 kpc.
//
// It finds the zero in ln r of the logarithm of mean density over threshold, whose
// slope is 4πr³ρ/M − 3, by Newton's method between brackets; a step that would
// leave them is replaced by bisection.
func RadiusAt(m Model, threshold float64) (float64, error) {
	if !(threshold > 0) || math.IsInf(threshold, 1) {
		return 0, fmt.Errorf("halo: the mean density %g Msun/kpc3 is not a positive number", threshold)
	}
	excess := func(r, mass float64) float64 {
		return math.Log(mass / (4 * math.Pi / 3 * threshold * r * r * r))
	}
	lo, hi := smallestRadius, largestRadius
	if !(excess(lo, m.Mass(lo)) >= 0 && excess(hi, m.Mass(hi)) <= 0) {
		return 0, fmt.Errorf("halo: no radius has the mean density %.4g Msun/kpc3 inside it", threshold)
	}
	r := 1e3
	for range 200 {
		mass := m.Mass(r)
		value := excess(r, mass)
		if value > 0 {
			lo = r
		} else {
			hi = r
		}
		step := value / (3 - 4*math.Pi*r*r*r*m.Density(r)/mass)
		next := r * math.Exp(step)
		switch {
		case math.Abs(step) < 1e-8: // the error left is of the order of the step squared
			return next, nil
		case !(next > lo && next < hi):
			next = math.Sqrt(lo * hi)
		}
		r = next
	}
	return 0, fmt.Errorf("halo: the radius with the mean density %.4g Msun/kpc3 inside it was not found", threshold)
}

// Convert returns the mass in Msun and the radius in kpc that the definition
// gives the model at redshift z.
func Convert(m Model, d Definition, c *cosmology.Cosmology, z float64) (mass, radius float64, err error) {
	threshold, err := d.Threshold(c, z)
	if err != nil {
		return 0, 0, err
	}
	if radius, err = RadiusAt(m, threshold); err != nil {
		return 0, 0, fmt.Errorf("%w (definition %s at z = %g)", err, d, z)
	}
	return m.Mass(radius), radius, nil
}
