package dynamics

import (
	"context"
	"math"
	"sort"

	"steelyard/probes/estimate"
)

// substructure is the test of Dressler & Shectman 1988: for each galaxy, the
// mean v̄ₗ and dispersion σₗ of its velocity and those of its ten nearest
// neighbours on the sky are compared with the whole's,
//
//	δ² = (11/σ²) [(v̄ₗ − v̄)² + (σₗ − σ)²],  Δ = Σ δ,
//
// and the p-value is the share of random permutations of the velocities among
// the positions whose Δ is at least as large, the observed one counted among
// them.
func (s *sample) substructure(ctx context.Context, t *estimate.Task) (delta, p float64, err error) {
	const permutations, chunk = 999, 37
	near := s.neighbours(10)
	delta = deviationSum(s.velocities, near)
	above := make([]int, (permutations+chunk-1)/chunk)
	stream := t.Sampling.Stream.Sub("substructure")
	err = inChunks(ctx, permutations, chunk, t.Sampling.Workers, func(c, from, to int) {
		rng := stream.Rand(c)
		shuffled := append([]float64(nil), s.velocities...)
		for range to - from {
			rng.Shuffle(len(shuffled), func(a, b int) { shuffled[a], shuffled[b] = shuffled[b], shuffled[a] })
			if deviationSum(shuffled, near) >= delta {
				above[c]++
			}
		}
	})
	n := 1
	for _, a := range above {
		n += a
	}
	return delta, float64(n) / (permutations + 1), err
}

// neighbours returns for each galaxy its own number and those of its k nearest
// on the sky, fewer when there are not so many.
func (s *sample) neighbours(k int) [][]int32 {
	n := len(s.galaxies)
	k = min(k+1, n)
	// Sorted by declination, the search for a galaxy's neighbours ends where the
	// difference in declination alone exceeds the distance of the k-th.
	order := make([]int, n)
	for i := range order {
		order[i] = i
	}
	north := func(i int) float64 { return s.galaxies[order[i]].North }
	sort.SliceStable(order, func(a, b int) bool { return s.galaxies[order[a]].North < s.galaxies[order[b]].North })
	out := make([][]int32, n)
	best := make([]float64, 0, k)
	for a, i := range order {
		g := s.galaxies[i]
		list := make([]int32, 0, k)
		best = best[:0]
		up, down := a, a-1
		for up < n || down >= 0 {
			b := up
			if up == n || (down >= 0 && g.North-north(down) < north(up)-g.North) {
				b = down
				down--
			} else {
				up++
			}
			h := s.galaxies[order[b]]
			if len(list) == k && math.Abs(h.North-g.North) > best[k-1] {
				break
			}
			d := math.Hypot(h.East-g.East, h.North-g.North)
			if len(list) == k && d >= best[k-1] {
				continue
			}
			at := sort.SearchFloat64s(best, d)
			if len(list) < k {
				best, list = append(best, 0), append(list, 0)
			}
			copy(best[at+1:], best[at:])
			copy(list[at+1:], list[at:])
			best[at], list[at] = d, int32(order[b])
		}
		out[i] = list
	}
	return out
}

// deviationSum is Δ of Dressler & Shectman.
func deviationSum(v []float64, near [][]int32) float64 {
	mean, sd := meanAndSpread(v, nil)
	sum := 0.0
	for _, group := range near {
		m, local := meanAndSpread(v, group)
		sum += math.Sqrt(float64(len(group)) / (sd * sd) * ((m-mean)*(m-mean) + (local-sd)*(local-sd)))
	}
	return sum
}

// meanAndSpread returns the mean and the standard deviation of the values at
// the given places, of all for nil.
func meanAndSpread(v []float64, at []int32) (mean, sd float64) {
	if at == nil {
		for _, x := range v {
			mean += x
		}
		mean /= float64(len(v))
		for _, x := range v {
			sd += (x - mean) * (x - mean)
		}
		return mean, math.Sqrt(sd / float64(len(v)-1))
	}
	for _, i := range at {
		mean += v[i]
	}
	mean /= float64(len(at))
	for _, i := range at {
		sd += (v[i] - mean) * (v[i] - mean)
	}
	return mean, math.Sqrt(sd / float64(len(at)-1))
}
