package infer

import "math"

// climb is one search for a maximum of the log posterior: quasi-Newton steps
// with the BFGS update of the inverse Hessian (Nocedal & Wright 2006, chapter
// 6) on forward differences whose step follows the scale the update has found.
// It asks only to come within a fraction of a standard deviation of the top:
// the curvature and the adaptation finish the work.
type climb struct {
	eval    func(z []float64) (float64, error)
	dim     int
	left    int       // evaluations it may still spend
	known   []mode    // tops found before: it stops when it nears one
	z       []float64 // where it stands
	logp    float64
	inverse []float64 // inverse Hessian of −logp, dim×dim
	merged  bool      // it stopped because it came near a known mode
}

// nearEnough is the gain in log posterior, expected of one more step, at which
// the search ends.
const nearEnough = 0.01

func (c *climb) run() error {
	d := c.dim
	c.inverse = identity(d)
	grad, next := make([]float64, d), make([]float64, d)
	if err := c.gradient(grad); err != nil {
		return err
	}
	step, trial, change := make([]float64, d), make([]float64, d), make([]float64, d)
	fresh := true // the inverse Hessian is still the prior's
	for c.left > 0 {
		gain := 0.0
		for i := range d {
			step[i] = dot(c.inverse[i*d:(i+1)*d], grad)
			gain += step[i] * grad[i]
		}
		if !(gain > 2*nearEnough) {
			if fresh || math.IsNaN(gain) {
				return nil
			}
			return nil
		}
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
			copy(c.inverse, identity(d))
			fresh = true
			continue
		}
		for i := range d {
			change[i] = trial[i] - c.z[i]
		}
		copy(c.z, trial)
		if c.nearKnown() {
			c.merged = true
			return nil
		}
		if err := c.gradient(next); err != nil {
			return err
		}
		c.update(change, grad, next, fresh)
		fresh = false
		copy(grad, next)
	}
	return nil
}

// gradient sets g to the gradient of logp at the present point.
func (c *climb) gradient(g []float64) error {
	for i := range g {
		h := min(max(0.03*math.Sqrt(c.inverse[i*c.dim+i]), 1e-9), 1e-3)
		if c.z[i] > 0 {
			h = -h // towards the bulk of the prior
		}
		g[i] = 0
		for range 2 {
			at := c.z[i]
			c.z[i] = at + h
			h = c.z[i] - at
			l, err := c.spend(c.z)
			c.z[i] = at
			if err != nil {
				return err
			}
			if !math.IsInf(l, -1) {
				g[i] = (l - c.logp) / h
				break
			}
			h = -h // an impossible model on this side: look on the other
		}
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

// update is the BFGS update from the step s and the change of the gradient of
// −logp; it is left out where logp curves upwards along the step.
func (c *climb) update(s, before, after []float64, first bool) {
	d := c.dim
	y, hy := make([]float64, d), make([]float64, d)
	for i := range y {
		y[i] = before[i] - after[i]
	}
	sy, yy := dot(s, y), dot(y, y)
	if !(sy > 1e-10*math.Sqrt(dot(s, s)*yy)) || math.IsInf(yy, 1) {
		return
	}
	if first { // scale the unit matrix to the curvature seen
		for i := range d {
			c.inverse[i*d+i] = min(sy/yy, 1)
		}
	}
	for i := range d {
		hy[i] = dot(c.inverse[i*d:(i+1)*d], y)
	}
	factor := (1 + dot(y, hy)/sy) / sy
	for i := range d {
		for j := range d {
			c.inverse[i*d+j] += factor*s[i]*s[j] - (hy[i]*s[j]+s[i]*hy[j])/sy
		}
	}
}

func (c *climb) spend(z []float64) (float64, error) {
	c.left--
	return c.eval(z)
}

// nearKnown reports whether the search has come within two standard deviations
// of a mode it need not find again.
func (c *climb) nearKnown() bool {
	for _, m := range c.known {
		if m.distance(c.z) < 2 {
			return true
		}
	}
	return false
}
