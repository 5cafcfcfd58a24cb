package reconcile

import (
	"cmp"
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"sort"
	"strings"

	"steelyard/probes/infer"
	"steelyard/probes/prior"
)

// sample draws the joint scores from the product of the posteriors themselves,
//
//	p(s) ∝ Π_j φ(s_j) Π_k p_k(s_k)/q_k(s_k) ,
//
// φ being the unit normal, p_k the density of estimate k's draws over the
// scores it names and q_k the prior those draws were made with. Each joint draw
// then takes a stored draw of every estimate from among the nearest in s.
func (j *Joint) sample(ctx context.Context, estimates []Estimate, posteriors []scorePosterior, doubts []string, stream infer.Stream) error {
	j.Sampled = true
	densities := make([]scoreDensity, len(posteriors))
	for k, p := range posteriors {
		if len(p.names) == 0 {
			continue
		}
		var err error
		if densities[k], err = newScoreDensity(p.scores); err != nil {
			return fmt.Errorf("%s: %w", estimates[k].Name, err)
		}
	}
	unit, err := prior.Normal(0, 1)
	if err != nil {
		return err
	}
	problem := infer.Problem{Likelihood: func() func([]float64) float64 {
		var own []float64
		return func(s []float64) float64 {
			sum := 0.0
			for k, p := range posteriors {
				if densities[k] == nil {
					continue
				}
				own = own[:0]
				for _, n := range p.names {
					own = append(own, s[n])
				}
				sum += densities[k].log(own) - p.logPrior(s)
			}
			return sum
		}
	}}
	for _, name := range j.Nuisances {
		problem.Free = append(problem.Free, infer.Free{Name: name, Prior: unit})
	}
	sample, err := infer.DrawPosterior(ctx, problem, infer.Options{Draws: j.N, Stream: stream})
	if err != nil {
		return fmt.Errorf("the shared nuisances cannot be sampled jointly: %w", err)
	}
	j.Scores = sample.Values
	how := "its value was sampled from all estimates jointly"
	if !sample.Quality.Converged {
		how += ", and the sampling did NOT converge"
	}
	j.Warnings = append(j.Warnings, fmt.Sprintf("shared %s: %s (%s)", strings.Join(prefixed(j.Nuisances), ", "), how, strings.Join(doubts, "; ")))
	for k, p := range posteriors {
		if densities[k] != nil {
			j.Order[k] = p.nearest(j.Scores, stream.Sub("draws of "+estimates[k].Name).Rand(0))
		}
	}
	return nil
}

func prefixed(names []string) []string {
	out := make([]string, len(names))
	for i, n := range names {
		out[i] = "nuisance." + n
	}
	return out
}

// logPrior is the log density of the prior the draws were made with, but for a
// constant.
func (p scorePosterior) logPrior(joint []float64) float64 {
	sum := 0.0
	for c, j := range p.names {
		u := (joint[j] - p.priors[c].Mean) / p.priors[c].SD
		sum -= u * u / 2
	}
	return sum
}

// neighbours is how many of the nearest stored draws one is picked from: a
// hundredth, so that there is a choice of residuals where the draws thin out too.
func neighbours(draws int) int { return min(max(draws/100, 8), 50) }

// nearest picks for each row of joint scores a stored draw at random among the
// nearest, distances being counted in standard deviations.
func (p scorePosterior) nearest(joint [][]float64, rng *rand.Rand) []int {
	order := make([]int, len(p.scores))
	for i := range order {
		order[i] = i
	}
	slices.SortFunc(order, func(a, b int) int {
		return cmp.Or(cmp.Compare(p.scores[a][0], p.scores[b][0]), cmp.Compare(a, b))
	})
	sd := make([]float64, len(p.names))
	for c := range sd {
		sd[c] = p.sd(c)
	}
	picks := make([]int, len(joint))
	found := nearestDraws{most: min(neighbours(len(order)), len(order))}
	for i, row := range joint {
		found.clear()
		look := func(at int) (beyond bool) {
			s, sum := p.scores[order[at]], 0.0
			for c, j := range p.names {
				u := (s[c] - row[j]) / sd[c]
				sum += u * u
				if c == 0 && sum > found.worst() {
					return true
				}
			}
			found.add(order[at], sum)
			return false
		}
		from := sort.Search(len(order), func(at int) bool { return p.scores[order[at]][0] >= row[p.names[0]] })
		for below, above := from-1, from; below >= 0 || above < len(order); {
			if above < len(order) {
				if look(above) {
					above = len(order)
				} else {
					above++
				}
			}
			if below >= 0 {
				if look(below) {
					below = -1
				} else {
					below--
				}
			}
		}
		picks[i] = found.draw[rng.IntN(len(found.draw))]
	}
	return picks
}

// nearestDraws keeps the nearest draws met so far, nearest first.
type nearestDraws struct {
	most     int
	draw     []int
	distance []float64
}

func (n *nearestDraws) clear() { n.draw, n.distance = n.draw[:0], n.distance[:0] }

func (n *nearestDraws) worst() float64 {
	if len(n.draw) < n.most {
		return math.Inf(1)
	}
	return n.distance[len(n.distance)-1]
}

func (n *nearestDraws) add(draw int, distance float64) {
	if distance >= n.worst() {
		return
	}
	at := sort.SearchFloat64s(n.distance, distance)
	n.draw, n.distance = slices.Insert(n.draw, at, draw), slices.Insert(n.distance, at, distance)
	if len(n.draw) > n.most {
		n.draw, n.distance = n.draw[:n.most], n.distance[:n.most]
	}
}
