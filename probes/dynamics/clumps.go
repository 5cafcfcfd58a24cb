package dynamics

import (
	"fmt"
	"math"
)

// twoClumps compares one normal with two of a common dispersion for velocities
// in rising order (Ashman, Bird & Zepf 1994). It returns −2 ln of the ratio of
// likelihoods and its p-value from χ² with two degrees of freedom, which is
// conservative (Thode, Finch & Mendell 1988), and a sentence when the two are
// separate clumps: centres more than two dispersions apart, at least a fifth of
// the galaxies in each.
func twoClumps(v []float64) (ratio, p float64, split string) {
	n := float64(len(v))
	_, sd := meanAndSpread(v, nil)
	variance := sd * sd * (n - 1) / n
	one := -n / 2 * (math.Log(2*math.Pi*variance) + 1)
	best := mixture{lnL: one}
	// Starts that cut the ordered sample at each quarter.
	for quarter := 1; quarter < 4; quarter++ {
		if m := fitMixture(v, len(v)*quarter/4); m.lnL > best.lnL {
			best = m
		}
	}
	ratio = math.Max(0, 2*(best.lnL-one))
	p = math.Exp(-ratio / 2)
	apart := (best.high - best.low) / best.sigma
	if best.sigma > 0 && apart > 2 && math.Min(best.share, 1-best.share) > 0.2 {
		split = fmt.Sprintf("the velocities look like two clumps along the line of sight, %.0f%% of the galaxies at %+.0f km/s and the rest at %+.0f km/s",
			100*best.share, best.low, best.high)
	}
	return ratio, p, split
}

// mixture is two normals of one dispersion.
type mixture struct {
	low, high, sigma float64
	share            float64 // of the lower one
	lnL              float64
}

// fitMixture maximises the likelihood by expectation and maximisation, from the
// sample cut in two.
func fitMixture(v []float64, cut int) mixture {
	lower, _ := meanAndSpread(v[:cut], nil)
	upper, _ := meanAndSpread(v[cut:], nil)
	_, sigma := meanAndSpread(v, nil)
	m := mixture{low: lower, high: upper, sigma: sigma / 2, share: float64(cut) / float64(len(v)), lnL: math.Inf(-1)}
	n := float64(len(v))
	inLow := make([]float64, len(v))
	for range 300 {
		var weight, sumLow, sumHigh, lnL float64
		lnShare, lnRest := math.Log(m.share), math.Log1p(-m.share)
		for i, x := range v {
			a := (x - m.low) / m.sigma
			b := (x - m.high) / m.sigma
			lower, upper := lnShare-a*a/2, lnRest-b*b/2
			// The smaller over the larger never overflows.
			less := math.Exp(-math.Abs(lower - upper))
			inLow[i] = 1 / (1 + less)
			if lower < upper {
				inLow[i] = less / (1 + less)
			}
			lnL += math.Max(lower, upper) + math.Log1p(less)
			weight += inLow[i]
			sumLow += inLow[i] * x
			sumHigh += (1 - inLow[i]) * x
		}
		lnL -= n * math.Log(m.sigma*math.Sqrt(2*math.Pi))
		if weight < 1 || weight > n-1 {
			return m
		}
		next := mixture{low: sumLow / weight, high: sumHigh / (n - weight), share: weight / n, lnL: lnL}
		for i, x := range v {
			next.sigma += inLow[i]*(x-next.low)*(x-next.low) + (1-inLow[i])*(x-next.high)*(x-next.high)
		}
		next.sigma = math.Sqrt(next.sigma / n)
		if next.sigma == 0 {
			return m
		}
		gain := lnL - m.lnL
		m = next
		if gain < 1e-6 {
			return m
		}
	}
	return m
}
