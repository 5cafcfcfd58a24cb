package infer

import (
	"context"
	"math"
	"slices"
	"sort"
)

// mode is a maximum of the posterior with the normal distribution that fits it.
type mode struct {
	z      []float64
	logp   float64
	factor []float64 // Cholesky factor of the covariance
	// settled is false for a place on a ridge where the search gave up: no
	// maximum, but a useful start for the mixture.
	settled bool
}

// distance is the Mahalanobis distance of z from the mode.
func (m mode) distance(z []float64) float64 {
	return math.Sqrt(whitened(make([]float64, len(z)), m.factor, z, m.z))
}

// lnMass is ln of the probability under the mode in Laplace's approximation.
func (m mode) lnMass() float64 {
	d := len(m.z)
	return m.logp + lnDet(m.factor, d) + float64(d)*lnRoot2Pi
}

const (
	climbsAtOnce = 8    // a constant: what one batch learns reaches the next
	unseenMass   = 0.01 // see findModes
)

// findModes climbs from the surveyed points, the promising and the remote in
// turn, until the share of the posterior's basins not yet seen is expected to
// be below one per cent: with w modes after n climbs that share is
// w(w+1)/n(n−1) (Boender & Rinnooy Kan 1987). A posterior on which the climbs
// get nowhere, a long curved ridge, is left to the adaptation after some
// thousand evaluations.
func findModes(ctx context.Context, t *target, z [][]float64, logp []float64) ([]mode, error) {
	order := startOrder(z, logp)
	var found []mode
	stop := t.spent + 1500 + 500*t.dim
	for n := 0; n < len(order) && t.spent < stop; {
		batch := make([]*climb, min(climbsAtOnce, len(order)-n))
		err := t.each(ctx, len(batch), func(w *worker, v *visit, i int) error {
			from := order[n+i]
			c := &climb{dim: t.dim, left: t.climbBudget(), known: found, logp: logp[from]}
			c.z = append(c.z, z[from]...)
			c.eval = func(z []float64) (float64, error) { return t.logPosterior(w, v, z) }
			batch[i] = c
			c.start(identity(t.dim))
			return c.run()
		})
		if err != nil {
			return nil, err
		}
		for _, c := range batch {
			m, err := t.settle(ctx, c, found)
			if err != nil {
				return nil, err
			}
			if !c.merged {
				found = append(found, m)
			}
		}
		n += len(batch)
		if w := float64(len(found)); w*(w+1) < unseenMass*float64(n)*float64(n-1) {
			break
		}
	}
	return worthKeeping(found), nil
}

// alreadyFound reports whether z, where the log posterior is logp, lies within
// two standard deviations of a known mode and no higher than it.
func alreadyFound(found []mode, z []float64, logp float64) bool {
	for _, m := range found {
		if logp < m.logp+0.5 && m.distance(z) < 2 {
			return true
		}
	}
	return false
}

// worthKeeping orders the modes by mass and drops those that hold less than
// e⁻²⁰ of the largest.
func worthKeeping(found []mode) []mode {
	sort.SliceStable(found, func(i, j int) bool { return found[i].lnMass() > found[j].lnMass() })
	for i, m := range found {
		if m.lnMass() < found[0].lnMass()-20 {
			return found[:i]
		}
	}
	return found
}

// settled counts the modes that are maxima, at least one.
func settled(modes []mode) int {
	n := 0
	for _, m := range modes {
		if m.settled {
			n++
		}
	}
	return max(1, n)
}

// startOrder ranks the surveyed points: the best, then by turns the one
// farthest from all chosen and the best left. Impossible points are left out.
func startOrder(z [][]float64, logp []float64) []int {
	var left []int
	for i, l := range logp {
		if !math.IsInf(l, -1) {
			left = append(left, i)
		}
	}
	sort.SliceStable(left, func(a, b int) bool { return logp[left[a]] > logp[left[b]] })
	if len(left) > fewStarts {
		left = left[:fewStarts]
	}
	nearest := make([]float64, len(left))
	for i := range nearest {
		nearest[i] = math.Inf(1)
	}
	var order []int
	for len(left) > 0 {
		pick := 0
		if len(order)%2 == 1 {
			for i := range left {
				if nearest[i] > nearest[pick] {
					pick = i
				}
			}
		}
		chosen := left[pick]
		order = append(order, chosen)
		left = append(left[:pick], left[pick+1:]...)
		nearest = append(nearest[:pick], nearest[pick+1:]...)
		for i, other := range left {
			sum := 0.0
			for j, s := range z[other] {
				sum += (s - z[chosen][j]) * (s - z[chosen][j])
			}
			nearest[i] = min(nearest[i], sum)
		}
	}
	return order
}

// settle finishes a climb: it fits a normal distribution where the climb ended
// and, while that shows that the top is still some way off, climbs on with the
// directions and scales so learnt. c.merged says that the climb reached a mode
// found before.
func (t *target) settle(ctx context.Context, c *climb, found []mode) (m mode, err error) {
	err = t.each(ctx, 1, func(w *worker, v *visit, _ int) error {
		c.eval = func(z []float64) (float64, error) { return t.logPosterior(w, v, z) }
		c.known = found
		for try := 0; try < 3; try++ {
			if c.merged = c.merged || alreadyFound(found, c.z, c.logp); c.merged {
				return nil
			}
			p := &probe{dim: t.dim, centre: c.z, logp: c.logp, eval: c.eval, basis: slices.Clone(c.factor)}
			var err error
			if m, err = p.fit(); err != nil {
				return err
			}
			if m.settled = m.logp < c.logp+0.1; m.settled {
				break
			}
			c.z, c.logp, c.left = slices.Clone(m.z), m.logp, t.climbBudget()
			c.start(m.factor)
			if err := c.run(); err != nil {
				return err
			}
		}
		c.merged = alreadyFound(found, m.z, m.logp)
		return nil
	})
	return m, err
}

// climbBudget is the number of evaluations one climb may spend.
func (t *target) climbBudget() int { return 40 * (t.dim + 2) }
