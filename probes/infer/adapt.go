package infer

import (
	"context"
	"fmt"
	"math"
)

// cloud is every point that the adaptation has proposed, with what is needed to
// weigh it against the mixture of all proposals so far (Cornuet et al. 2012).
type cloud struct {
	z      [][]float64
	logp   []float64
	rounds []round
	lnSum  []float64 // ln Σ_t n_t q_t(z)
}

type round struct {
	n       int
	density func([][]float64) []float64
}

// add takes in n points proposed from the given density.
func (c *cloud) add(z [][]float64, logp []float64, density func([][]float64) []float64) {
	latest := round{len(z), density}
	for i, l := range density(c.z) {
		c.lnSum[i] = lnAdd(c.lnSum[i], l+math.Log(float64(latest.n)))
	}
	c.rounds = append(c.rounds, latest)
	sums := make([]float64, len(z))
	for i := range sums {
		sums[i] = math.Inf(-1)
	}
	for _, r := range c.rounds {
		for i, l := range r.density(z) {
			sums[i] = lnAdd(sums[i], l+math.Log(float64(r.n)))
		}
	}
	c.z, c.logp, c.lnSum = append(c.z, z...), append(c.logp, logp...), append(c.lnSum, sums...)
}

// weights returns the normalised importance weights of all points, none of them
// above the mean times √n (Ionides 2008), which keeps one lucky point from
// drawing the whole mixture to itself.
func (c *cloud) weights() []float64 {
	lnW := make([]float64, len(c.z))
	for i := range lnW {
		lnW[i] = c.logp[i] - c.lnSum[i]
	}
	_, lnMean := normalised(lnW)
	top := lnMean + math.Log(float64(len(lnW)))/2
	for i := range lnW {
		lnW[i] = min(lnW[i], top)
	}
	w, _ := normalised(lnW)
	return w
}

func lnAdd(a, b float64) float64 {
	if a < b {
		a, b = b, a
	}
	if math.IsInf(b, -1) {
		return a
	}
	return a + math.Log1p(math.Exp(b-a))
}

func priorDensity(z [][]float64) []float64 {
	out := make([]float64, len(z))
	for i := range z {
		out[i] = lnUnitNormal(z[i])
	}
	return out
}

const (
	mostParts  = 24
	mostRounds = 14
)

// adapt learns the mixture in rounds of proposals until a round's own
// efficiency (effective size over size) is high or no longer rises.
func (t *target) adapt(ctx context.Context, m *mixture, c *cloud, s Stream) (*mixture, error) {
	perRound := 150 + 75*t.dim
	best, stale := 0.0, 0
	for r := 0; r < mostRounds && stale < 3; r++ {
		z := m.draw(perRound, s.Sub(fmt.Sprintf("round %d", r)))
		logp, err := t.evaluate(ctx, z)
		if err != nil {
			return nil, err
		}
		efficiency := m.efficiency(z, logp)
		c.add(z, logp, m.lnDensity)
		w := c.weights()
		if efficiency < 0.7 && r > 0 {
			for grown := 0; grown < 3 && len(m.parts) < mostParts; grown++ {
				m = m.grow(c.z, m.shortfall(c.z, w))
			}
		}
		for range 3 {
			m = m.refit(c.z, w)
		}
		if efficiency > 0.85 {
			break
		}
		stale++
		if efficiency > best+0.03 {
			best, stale = efficiency, 0
		}
	}
	m.chooseDof(c.z, c.weights())
	return m, nil
}

// shortfall is the weight of each point times how far the mixture falls short
// of the posterior there, normalised.
func (m *mixture) shortfall(z [][]float64, w []float64) []float64 {
	out := make([]float64, len(w))
	lnQ := m.lnDensity(z)
	for i, v := range w {
		out[i] = math.Log(v) - lnQ[i]
	}
	_ = lnQ
	n, _ := normalised(out)
	return n
}

// efficiency is the effective size of the points, proposed by m, over their
// number.
func (m *mixture) efficiency(z [][]float64, logp []float64) float64 {
	lnW := m.lnDensity(z)
	for i := range lnW {
		lnW[i] = logp[i] - lnW[i]
	}
	w, _ := normalised(lnW)
	return kish(w) / float64(len(z))
}

// chooseDof picks the degrees of freedom under which the weighted points are
// most probable.
func (m *mixture) chooseDof(z [][]float64, w []float64) {
	bestDof, best := m.dof, math.Inf(-1)
	for _, dof := range []float64{3, 5, 8, 15, 30} {
		m.setDof(dof)
		sum := 0.0
		for i, l := range m.lnDensity(z) {
			if w[i] > 0 {
				sum += w[i] * l
			}
		}
		if sum > best {
			bestDof, best = dof, sum
		}
	}
	m.setDof(bestDof)
}
