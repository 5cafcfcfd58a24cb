package infer

import (
	"math"
	"slices"
)

// climb is one search for a maximum of the log posterior: quasi-Newton steps
// with the BFGS update of the inverse Hessian (Nocedal & Wright 2006, chapter
// 6). Slopes are differences over a small part of a standard deviation along
// the columns of the Cholesky factor of that inverse, so that a degenerate
// posterior is measured at its own scale in every direction. The search asks
// only to come within a fraction of a standard deviation of the top: curvature
// and adaptation finish the work.
type climb struct {
	eval    func(z []float64) (float64, error)
	dim     int
	left    int    // evaluations it may still spend
	known   []mode // tops found before: it stops when it nears one
	z       []float64
	logp    float64 // where it stands
	inverse []float64
	factor  []float64 // Cholesky factor of inverse
	fresh   bool      // inverse is still the unit matrix
	merged  bool      // it stopped because it came near a known mode
}

const (
	nearEnough = 0.01 // gain in logp, expected of one more step, at which the search ends
	slopeStep  = 0.05 // standard deviations over which a slope is measured
)

func (c *climb) run() error {
	d := c.dim
	fresh := c.fresh
	slope, before, after := make([]float64, d), make([]float64, d), make([]float64, d)
	step, trial, move := make([]float64, d), make([]float64, d), make([]float64, d)
	origin := make([]float64, d)
	if err := c.slopes(slope, before); err != nil {
		return err
	}
	for c.left > 0 {
		gain := dot(slope, slope)
		if !(gain > 2*nearEnough) {
			return nil
		}
		unwhitened(step, c.factor, slope, origin, 1)
		// No step longer than one prior standard deviation.
		if length := math.Sqrt(dot(step, step)); length > 1 {
			for i := range step {
				step[i] /= length
			}
			gain /= length
		}
		moved, err := c.search(step, trial, gain)
		if err != nil {
			return err
		}
		if !moved {
			if fresh {
				return nil
			}
			// The curvature misleads: once more from the prior's.
			c.start(identity(d))
			fresh = true
			if err := c.slopes(slope, before); err != nil {
				return err
			}
			continue
		}
		for i := range d {
			move[i] = trial[i] - c.z[i]
		}
		copy(c.z, trial)
		if alreadyFound(c.known, c.z, c.logp) {
			c.merged = true
			return nil
		}
		if err := c.slopes(slope, after); err != nil {
			return err
		}
		if c.update(move, before, after, fresh) {
			fresh = false
			// The slope in the new directions: Lᵀ times the gradient.
			for k := range d {
				slope[k] = 0
				for i := k; i < d; i++ {
					slope[k] += c.factor[i*d+k] * after[i]
				}
			}
		}
		before, after = after, before
	}
	return nil
}

// start sets the inverse Hessian to L Lᵀ; with the unit matrix, the prior's, its
// scale is still to be learnt.
func (c *climb) start(l []float64) {
	d := c.dim
	c.factor = slices.Clone(l)
	c.inverse = make([]float64, d*d)
	c.fresh = true
	for i := range d {
		for j := range d {
			c.inverse[i*d+j] = dot(l[i*d:(i+1)*d], l[j*d:(j+1)*d])
			c.fresh = c.fresh && (i == j) == (c.inverse[i*d+j] != 0)
		}
	}
}

// slopes measures the derivative of logp along each column of the factor, per
// standard deviation, and from these its gradient. The term ε/2 corrects a
// one-sided difference for the unit curvature that the factor stands for.
func (c *climb) slopes(slope, gradient []float64) error {
	d := c.dim
	at := make([]float64, d)
	for k := range d {
		slope[k] = 0
		for _, h := range []float64{slopeStep, -slopeStep} {
			for i := range d {
				at[i] = c.z[i] + h*c.factor[i*d+k]
			}
			l, err := c.spend(at)
			if err != nil {
				return err
			}
			if !math.IsInf(l, -1) { // else an impossible model on this side
				slope[k] = (l-c.logp)/h + h/2
				break
			}
		}
	}
	// gradient = L⁻ᵀ slope
	for i := d - 1; i >= 0; i-- {
		v := slope[i]
		for r := i + 1; r < d; r++ {
			v -= c.factor[r*d+i] * gradient[r]
		}
		gradient[i] = v / c.factor[i*d+i]
	}
	return nil
}

// search shortens the step until logp has risen by a fair part of what the
// slope promises; trial and logp are then the new point's.
func (c *climb) search(step, trial []float64, gain float64) (bool, error) {
	for length := 1.0; length > 1e-10 && c.left > 0; {
		for i := range trial {
			trial[i] = c.z[i] + length*step[i]
		}
		l, err := c.spend(trial)
		if err != nil {
			return false, err
		}
		if l > c.logp+1e-4*length*gain {
			c.logp = l
			return true, nil
		}
		// The parabola through both values and the slope, within limits.
		shrink := 0.25
		if !math.IsInf(l, -1) {
			shrink = gain * length / 2 / (gain*length - (l - c.logp))
		}
		length *= min(max(shrink, 0.02), 0.5)
	}
	return false, nil
}

// update is the BFGS update from a step s and the gradients of logp before and
// after it. It is left out, and false, where logp curves upwards along the
// step or the result is not positive definite.
func (c *climb) update(s, before, after []float64, first bool) bool {
	d := c.dim
	y, hy := make([]float64, d), make([]float64, d)
	for i := range y {
		y[i] = before[i] - after[i]
	}
	sy, yy := dot(s, y), dot(y, y)
	if !(sy > 1e-10*math.Sqrt(dot(s, s)*yy)) || math.IsInf(yy, 1) {
		return false
	}
	inverse := append([]float64(nil), c.inverse...)
	if first { // scale the unit matrix to the curvature seen
		for i := range d {
			inverse[i*d+i] = min(sy/yy, 1)
		}
	}
	for i := range d {
		hy[i] = dot(inverse[i*d:(i+1)*d], y)
	}
	factor := (1 + dot(y, hy)/sy) / sy
	for i := range d {
		for j := range d {
			inverse[i*d+j] += factor*s[i]*s[j] - (hy[i]*s[j]+s[i]*hy[j])/sy
		}
	}
	l := append([]float64(nil), inverse...)
	if !cholesky(l, d) {
		return false
	}
	c.inverse, c.factor = inverse, l
	return true
}

func (c *climb) spend(z []float64) (float64, error) {
	c.left--
	return c.eval(z)
}
