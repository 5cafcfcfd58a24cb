package dynamics

import (
	"fmt"
	"math"

	"steelyard/probes/estimate"
	"steelyard/probes/prior"
)

// quoted is one published dispersion, without its galaxies.
type quoted struct {
	value   prior.Prior // km/s
	within  float64     // kpc, the aperture it holds in; 0 when not stated
	members int         // 0 when not stated
	notes   []string
}

// readQuoted reads the block `dispersion`.
func readQuoted(t *estimate.Task) (*quoted, error) {
	block, ok := t.Blocks["dispersion"]
	if !ok {
		return nil, t.Errorf("neither galaxies nor a quoted dispersion are given: add a block `galaxies` or `dispersion`")
	}
	q := &quoted{value: block["value"].Prior, members: int(block["members"].Prior.A)}
	value := q.value.A
	if value <= 0 {
		return nil, t.Errorf("the quoted dispersion must be positive, not %g km/s", value)
	}
	if q.members != 0 && q.members < fewest {
		return nil, t.Errorf("a dispersion of %d galaxies is not used; it takes at least %d", q.members, fewest)
	}
	if within := block["within"]; within.Set {
		q.within = kpc(t, within.Prior.A, within.Unit)
		if q.within <= 0 {
			return nil, t.Errorf("the radius within which the dispersion holds must be positive")
		}
	}
	q.notes = append(q.notes, fmt.Sprintf("dispersion: %s km/s as quoted", q.value))
	if q.value.IsExact() {
		if q.members == 0 {
			return nil, t.Errorf("the quoted dispersion has neither an error nor a number of members to derive one: write `value = \"%g +- … km/s\"`", value)
		}
		// The error of a standard deviation of normal deviates.
		sd := value / math.Sqrt(2*float64(q.members-1))
		q.value = prior.Prior{Kind: prior.NormalKind, A: value, B: sd}
		q.notes = append(q.notes, fmt.Sprintf("its error, not quoted, is that of %d normal velocities, %.0f km/s", q.members, sd))
	}
	if q.members != 0 {
		q.notes = append(q.notes, fmt.Sprintf("%d members", q.members))
	}
	return q, nil
}

// draws fills out with draws of the dispersion, those that are not positive
// left out.
func (q *quoted) draws(t *estimate.Task, out []float64) error {
	rng := t.Sampling.Stream.Sub("dispersion").Rand(0)
	for i := range out {
		for try := 0; out[i] <= 0; try++ {
			if try == 1000 {
				return t.Errorf("the error of the quoted dispersion leaves no positive values")
			}
			out[i] = q.value.FromScore(rng.NormFloat64())
		}
	}
	return nil
}

// kpc converts a length that may stand as an angle.
func kpc(t *estimate.Task, x float64, unit string) float64 {
	if unit == "rad" {
		return x * t.Cosmology.AngularDiameter(t.Object.Redshift)
	}
	return x
}
