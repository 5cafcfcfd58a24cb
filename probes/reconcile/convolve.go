package reconcile

import (
	"math"
	"math/cmplx"
	"slices"
	"sort"

	"gonum.org/v1/gonum/dsp/fourier"
	"gonum.org/v1/gonum/mathext"
)

const (
	cells = 4096 // of the grid on which densities are convolved
	// kernel is the width of the smoothing kernel in standard deviations of the
	// sum; its variance is taken out of the draws beforehand.
	kernel = 0.1
	// resolved is the relative Monte Carlo error of a tail probability beyond
	// which a fitted tail takes over: 0.5 in p is about 0.12σ at 4σ.
	resolved = 0.5
)

// grid is a function on evenly spaced points.
type grid struct {
	from, step float64
	values     []float64
}

func (g grid) x(i int) float64 { return g.from + float64(i)*g.step }

// at interpolates linearly; outside the grid it gives the end values.
func (g grid) at(x float64) float64 {
	u := (x - g.from) / g.step
	if !(u > 0) {
		return g.values[0]
	}
	i := int(u)
	if i >= len(g.values)-1 {
		return g.values[len(g.values)-1]
	}
	f := u - float64(i)
	return (1-f)*g.values[i] + f*g.values[i+1]
}

// cumulate returns the running integral of a density by the trapezium rule.
func (g grid) cumulate() grid {
	c := grid{g.from, g.step, make([]float64, len(g.values))}
	for i := 1; i < len(g.values); i++ {
		c.values[i] = c.values[i-1] + (g.values[i-1]+g.values[i])/2*g.step
	}
	return c
}

// histogram holds draws shared linearly between neighbouring points of a grid
// that starts at the smallest of them.
type histogram struct {
	grid // values add up to one
	n    int
}

func newHistogram(x []float64, step float64) histogram {
	h := histogram{grid{from: slices.Min(x), step: step}, len(x)}
	h.values = make([]float64, int((slices.Max(x)-h.from)/step)+2)
	for _, v := range x {
		u := (v - h.from) / step
		i := int(u)
		f := u - float64(i)
		h.values[i] += (1 - f) / float64(len(x))
		h.values[i+1] += f / float64(len(x))
	}
	return h
}

// sumDensity is the density of the sum of one draw of each part and a normal
// deviate of the given width, over all combinations of the draws: the product
// of the transforms.
func sumDensity(parts []histogram, step, width float64) grid {
	fft := fourier.NewFFT(cells)
	pad := 8 * width
	g := grid{from: -pad, step: step}
	total := make([]complex128, cells/2+1)
	for i := range total {
		k := 2 * math.Pi * float64(i) / (cells * step)
		total[i] = cmplx.Rect(math.Exp(-k*k*width*width/2), -k*pad)
	}
	buffer := make([]float64, cells)
	for _, h := range parts {
		g.from += h.from
		clear(buffer)
		copy(buffer, h.values)
		for i, c := range fft.Coefficients(nil, buffer) {
			total[i] *= c
		}
	}
	g.values = fft.Sequence(nil, total)
	for i, v := range g.values {
		// Rounding leaves ±1e-17 where the density vanishes.
		g.values[i] = max(v/cells/step, 0)
	}
	return g
}

// density is the probability density of a sum of independent quantities, each
// known by its draws. n draws of each resolve what n² pairs would; beyond, two
// normal tails continue it.
type density struct {
	grid
	lower, upper tail
	order        []float64 // densities of the points between the tails, rising
	below        []float64 // probability of those up to order[i]
}

// convolve returns the density of the sum of the parts, each a set of draws;
// parts that are nil are left out.
//
// At least one part must vary.
func convolve(parts ...[]float64) *density {
	parts = slices.DeleteFunc(parts, func(p []float64) bool { return p == nil })
	variance := 0.0
	for _, p := range parts {
		_, sd := meanSD(p)
		variance += sd * sd
	}
	width := kernel * math.Sqrt(variance)
	span := 16 * width
	shrunk := make([][]float64, len(parts))
	for k, p := range parts {
		shrunk[k] = shrink(p)
		span += slices.Max(shrunk[k]) - slices.Min(shrunk[k])
	}
	// Two spare points a part: a histogram is up to two longer than its range.
	step := span / float64(cells-2*len(parts)-2)
	d := &density{}
	histograms := histogramsOf(shrunk, step)
	d.grid = sumDensity(histograms, step, width)
	d.lower = lowerTail(histograms, step, width)
	for k := range shrunk {
		for i := range shrunk[k] {
			shrunk[k][i] = -shrunk[k][i]
		}
	}
	d.upper = lowerTail(histogramsOf(shrunk, step), step, width)
	d.upper.x = -d.upper.x
	d.rank()
	return d
}

// shrink draws a set of draws towards its mean, to make room for the variance
// that the kernel adds.
func shrink(x []float64) []float64 {
	mean, _ := meanSD(x)
	out := make([]float64, len(x))
	for i, v := range x {
		out[i] = mean + math.Sqrt(1-kernel*kernel)*(v-mean)
	}
	return out
}

func histogramsOf(parts [][]float64, step float64) []histogram {
	out := make([]histogram, len(parts))
	for k, p := range parts {
		out[k] = newHistogram(p, step)
	}
	return out
}

// tail continues a density beyond x outwards as a normal one: at a distance u
// beyond x it is −z + slope·u standard deviations out (z is negative).
type tail struct{ x, z, slope float64 }

// lowerTail finds how far down the draws resolve the distribution of their sum,
// and the normal tail that continues it with the slope it has over the last
// standard deviation.
func lowerTail(parts []histogram, step, width float64) tail {
	cumulative := sumDensity(parts, step, width).cumulate()
	others := make([]grid, len(parts))
	for k := range parts {
		rest := append(slices.Clone(parts[:k]), parts[k+1:]...)
		others[k] = sumDensity(rest, step, width).cumulate()
	}
	// The relative error falls inwards, so the last resolved point is found by
	// bisection; the tenth percentile is always taken as resolved.
	last := sort.Search(cells, func(i int) bool { return cumulative.values[i] >= 0.1 })
	first := sort.Search(last, func(i int) bool {
		p := cumulative.values[i]
		return p > 1e-13 && relativeError(parts, others, cumulative.x(i), p) < resolved
	})
	z := mathext.NormalQuantile(cumulative.values[first])
	inner := first + 1
	for inner < cells-1 && mathext.NormalQuantile(min(cumulative.values[inner], 1)) < z+1 {
		inner++
	}
	rise := mathext.NormalQuantile(min(cumulative.values[inner], 1-1e-12)) - z
	return tail{cumulative.x(first), z, rise / (step * float64(inner-first))}
}

// relativeError is the Monte Carlo error of p, the probability of a sum below
// x, in units of p: each part's draws scatter it by the scatter, among them, of
// the probability that the other parts make up the rest.
func relativeError(parts []histogram, others []grid, x, p float64) float64 {
	sum := 0.0
	for k, h := range parts {
		square := 0.0
		for i, w := range h.values {
			if w > 0 {
				s := others[k].at(x - h.x(i))
				square += w * s * s
			}
		}
		sum += max(square/(p*p)-1, 0) / float64(h.n)
	}
	return math.Sqrt(sum)
}

// rank orders the points between the tails by density.
func (d *density) rank() {
	for i, rho := range d.values {
		if x := d.x(i); x >= d.lower.x && x <= d.upper.x {
			d.order = append(d.order, rho)
		}
	}
	slices.Sort(d.order)
	d.below = make([]float64, len(d.order))
	sum := 0.0
	for k, rho := range d.order {
		sum += rho * d.step
		d.below[k] = sum
	}
}

// logDensity is the logarithm of the tail's density at a distance u beyond its
// start.
func (t tail) logDensity(u float64) float64 {
	z := -t.z + t.slope*u
	return -z*z/2 + math.Log(t.slope) - math.Log(2*math.Pi)/2
}

// lessLikely is the probability of the part of the tail whose density is below
// exp(level).
func (t tail) lessLikely(level float64) float64 {
	z2 := -2 * (level - math.Log(t.slope) + math.Log(2*math.Pi)/2)
	return normalBelow(-max(math.Sqrt(max(z2, 0)), -t.z))
}

// LessLikely is the probability of values less likely than x, and whether a
// fitted tail was used to tell (Raveri & Doux 2021, their eq. for the
// probability mass outside the isodensity contour through x).
func (d *density) LessLikely(x float64) (p float64, fitted bool) {
	var level float64
	switch {
	case x < d.lower.x:
		level, fitted = d.lower.logDensity(d.lower.x-x), true
	case x > d.upper.x:
		level, fitted = d.upper.logDensity(x-d.upper.x), true
	default:
		level = math.Log(d.at(x))
	}
	p = d.lower.lessLikely(level) + d.upper.lessLikely(level)
	rho := math.Exp(level)
	if k := sort.SearchFloat64s(d.order, rho); k > 0 {
		p += d.below[k-1]
	}
	// Nothing here is known to 1e-300; it keeps a significance finite.
	return min(max(p, 1e-300), 1), fitted || rho == 0
}
