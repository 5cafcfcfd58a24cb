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

// temper is the power of the posterior that the mixture is fitted to. It makes
// the proposal a little wider than the posterior: too wide costs a little
// efficiency, too narrow goes unnoticed.
const temper = 0.85

// weights returns the normalised weights with which all points stand for the
// tempered posterior, none of them above the mean times √n (Ionides 2008), which
// keeps one lucky point from drawing the whole mixture to itself.
func (c *cloud) weights() []float64 {
	lnW := make([]float64, len(c.z))
	for i := range lnW {
		lnW[i] = temper*c.logp[i] - c.lnSum[i]
	}
	_, lnMean := normalised(lnW)
	top := lnMean + math.Log(float64(len(lnW)))/2
	for i := range lnW {
		lnW[i] = min(lnW[i], top)
	}
	w, _ := normalised(lnW)
	return w
}

// prune forgets the points that have no say in a fit, those lighter than a
// millionth of an even share; the proposals they stand for still count.
func (c *cloud) prune() {
	w := c.weights()
	least := 1e-6 / float64(len(w))
	kept := 0
	for i, v := range w {
		if v > least {
			c.z[kept], c.logp[kept], c.lnSum[kept] = c.z[i], c.logp[i], c.lnSum[i]
			kept++
		}
	}
	c.z, c.logp, c.lnSum = c.z[:kept], c.logp[:kept], c.lnSum[:kept]
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
	mostParts  = 30
	mostRounds = 20
	goodRound  = 0.75 // efficiency at which a round ends the adaptation
	poorRound  = 0.60 // efficiency below which parts are added
	heavyRound = 0.50 // tail shape above which parts are added, and the adaptation goes on
)

// adapt learns the mixture in rounds of proposals, until a round's own
// efficiency (effective size over size) is high, or no longer rises and its
// weights have no heavy tail. Rounds grow as a posterior proves difficult.
func (t *target) adapt(ctx context.Context, m *mixture, c *cloud, s Stream) (_ *mixture, efficiency float64, err error) {
	best, stale := 0.0, 0
	for r := range mostRounds {
		z := m.draw((150+75*t.dim)*(4+r)/4, s.Sub(fmt.Sprintf("round %d", r)))
		logp, err := t.evaluate(ctx, z)
		if err != nil {
			return nil, 0, err
		}
		var shape float64
		efficiency, shape = m.judge(z, logp)
		c.add(z, logp, m.lnDensity)
		c.prune()
		w := c.weights()
		if (efficiency < poorRound || shape > heavyRound) && r > 0 {
			for grown := 0; grown < 3 && len(m.parts) < mostParts; grown++ {
				m = m.grow(c.z, c.logp, w)
			}
		}
		for range 2 {
			m = m.refit(c.z, w)
		}
		stale++
		if efficiency > best+0.03 {
			best, stale = efficiency, 0
		}
		settled := (efficiency > goodRound || stale >= 3) && shape < heavyRound
		if settled || r >= mostRounds/2 && efficiency < hopeless {
			break
		}
	}
	return m, efficiency, nil
}

// judge returns the effective size of the points, proposed by m, over their
// number, and the tail shape of their weights.
func (m *mixture) judge(z [][]float64, logp []float64) (efficiency, shape float64) {
	lnW := m.lnDensity(z)
	for i := range lnW {
		lnW[i] = logp[i] - lnW[i]
	}
	w, _ := normalised(lnW)
	return kish(w) / float64(len(z)), smooth(lnW)
}
