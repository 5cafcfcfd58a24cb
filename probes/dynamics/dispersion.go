package dynamics

import (
	"math"
	"sort"
)

// The estimators of location and scale work on velocities in rising order, each
// with the number of times it counts, so that a bootstrap resample costs one
// pass over the sorted sample instead of a sort of its own. Counts of nil mean
// that each velocity counts once.

// BiweightLocation returns the one-step biweight estimate of the centre of v,
//
//	M + Σ (v−M)(1−u²)² / Σ (1−u²)²,  u = (v−M)/(6 MAD), |u| < 1,
//
// M being the median and MAD the median absolute deviation from it (Beers,
// Flynn & Gebhardt 1990, eq. 5). Where MAD is zero it is the median. v may be in
// any order and must not be empty.
func BiweightLocation(v []float64) float64 { return biweightLocation(sorted(v), nil) }

// BiweightScale returns the biweight estimate of the dispersion of v,
//
//	√N [Σ (v−M)²(1−u²)⁴]^½ / |Σ (1−u²)(1−5u²)|,  u = (v−M)/(9 MAD), |u| < 1,
//
// N counting all velocities (Beers, Flynn & Gebhardt 1990, eq. 9). Where MAD is
// zero, more than half of the velocities being equal, it falls back to the
// gapper. v may be in any order and must hold at least two values.
func BiweightScale(v []float64) float64 { return biweightScale(sorted(v), nil) }

// Gapper returns the dispersion from the gaps between the ordered velocities,
//
//	√π/(N(N−1)) Σ i(N−i) (v_{i+1} − v_i)
//
// (Wainer & Thissen 1976; Beers, Flynn & Gebhardt 1990, eq. 10). It equals
// √π/2 times Gini's mean difference.
func Gapper(v []float64) float64 { return gapper(sorted(v), nil) }

// StandardDeviation returns the square root of the variance about the mean,
// with N−1 in the denominator.
func StandardDeviation(v []float64) float64 { return standard(sorted(v), nil) }

func sorted(v []float64) []float64 {
	out := append([]float64(nil), v...)
	sort.Float64s(out)
	return out
}

// scale is one estimator of dispersion on a sorted, counted sample.
type scale struct {
	name string
	of   func(v []float64, counts []int) float64
	// shrink is the factor by which the estimate of a resample of n falls short
	// of the estimate of the sample on average, since a resample draws from a
	// population whose variance is (n−1)/n of the unbiased one.
	shrink func(n float64) float64
}

func scaleNamed(name string, members int) scale {
	if name == "automatic" {
		// Below about 15 velocities the biweight loses efficiency and the gapper
		// is recommended (Beers, Flynn & Gebhardt 1990, section VI).
		name = "biweight"
		if members < 15 {
			name = "gapper"
		}
	}
	switch name {
	case "gapper":
		return scale{name, gapper, func(n float64) float64 { return (n - 1) / n }}
	case "standard":
		return scale{name, standard, func(n float64) float64 { return math.Sqrt((n - 1) / n) }}
	default:
		return scale{name, biweightScale, func(float64) float64 { return 1 }}
	}
}

func count(counts []int, i int) int {
	if counts == nil {
		return 1
	}
	return counts[i]
}

func total(v []float64, counts []int) int {
	if counts == nil {
		return len(v)
	}
	n := 0
	for _, c := range counts {
		n += c
	}
	return n
}

func biweightLocation(v []float64, counts []int) float64 {
	m := median(v, counts)
	mad := deviation(v, counts, m)
	if mad == 0 {
		return m
	}
	var sum, weight float64
	for i, x := range v {
		u := (x - m) / (6 * mad)
		if u2 := u * u; u2 < 1 {
			w := float64(count(counts, i)) * (1 - u2) * (1 - u2)
			sum += w * (x - m)
			weight += w
		}
	}
	return m + sum/weight
}

func biweightScale(v []float64, counts []int) float64 {
	m := median(v, counts)
	mad := deviation(v, counts, m)
	if mad == 0 {
		return gapper(v, counts)
	}
	var above, below float64
	for i, x := range v {
		u := (x - m) / (9 * mad)
		if u2 := u * u; u2 < 1 {
			c, k := float64(count(counts, i)), 1-u2
			above += c * (x - m) * (x - m) * (k * k) * (k * k)
			below += c * k * (1 - 5*u2)
		}
	}
	return math.Sqrt(float64(total(v, counts))*above) / math.Abs(below)
}

func gapper(v []float64, counts []int) float64 {
	n := float64(total(v, counts))
	var sum, below float64
	for i := 0; i+1 < len(v); i++ {
		below += float64(count(counts, i))
		sum += below * (n - below) * (v[i+1] - v[i])
	}
	return math.Sqrt(math.Pi) / (n * (n - 1)) * sum
}

func standard(v []float64, counts []int) float64 {
	n := float64(total(v, counts))
	var sum float64
	for i, x := range v {
		sum += float64(count(counts, i)) * x
	}
	mean := sum / n
	sum = 0
	for i, x := range v {
		sum += float64(count(counts, i)) * (x - mean) * (x - mean)
	}
	return math.Sqrt(sum / (n - 1))
}

// median returns the middle value, or the mean of the two middle values.
func median(v []float64, counts []int) float64 {
	n := total(v, counts)
	low, high := (n-1)/2, n/2 // positions, from 0
	var first float64
	seen, found := 0, false
	for i, x := range v {
		seen += count(counts, i)
		if !found && seen > low {
			first, found = x, true
		}
		if seen > high {
			return (first + x) / 2
		}
	}
	return math.NaN()
}

// deviation returns the median of |v − m| by walking outwards from m on both
// sides of the sorted sample, nearest first.
func deviation(v []float64, counts []int, m float64) float64 {
	n := total(v, counts)
	low, high := (n-1)/2, n/2
	right := sort.SearchFloat64s(v, m)
	left := right - 1
	var first float64
	seen, found := 0, false
	for left >= 0 || right < len(v) {
		var d float64
		if right == len(v) || (left >= 0 && m-v[left] <= v[right]-m) {
			d = m - v[left]
			seen += count(counts, left)
			left--
		} else {
			d = v[right] - m
			seen += count(counts, right)
			right++
		}
		if !found && seen > low {
			first, found = d, true
		}
		if seen > high {
			return (first + d) / 2
		}
	}
	return math.NaN()
}
