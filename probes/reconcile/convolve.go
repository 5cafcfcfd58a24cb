package reconcile

import (
	"math"
	"slices"
	"sort"

	"gonum.org/v1/gonum/dsp/fourier"
)

const (
	// fewestCells and mostCells bound the grid on which densities are convolved; in
	// between it is as fine as takes two points a kernel width.
	fewestCells = 2048
	mostCells   = 1 << 15
	// kernel is the width of the smoothing kernel in standard deviations of the
	// sum; its variance is taken out of the draws beforehand.
	kernel = 0.05
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

// mirror is the function of −x.
func (g grid) mirror() grid {
	m := grid{-g.x(len(g.values) - 1), g.step, slices.Clone(g.values)}
	slices.Reverse(m.values)
	return m
}

// histogram holds draws shared linearly between neighbouring points of a grid
// that starts at the smallest of them.
type histogram struct{ grid } // values add up to one

func newHistogram(x []float64, step float64) histogram {
	h := histogram{grid{from: slices.Min(x), step: step}}
	h.values = make([]float64, int((slices.Max(x)-h.from)/step)+2)
	weight, perStep := 1/float64(len(x)), 1/step
	for _, v := range x {
		u := (v - h.from) * perStep
		i := int(u)
		f := u - float64(i)
		h.values[i] += (1 - f) * weight
		h.values[i+1] += f * weight
	}
	return h
}

// sumDensity is the density of the sum of one draw of each part and a normal
// deviate of the given width, over all combinations of the draws: the product
// of the transforms.
func sumDensity(parts []histogram, cells int, step, width float64) grid {
	fft := fourier.NewFFT(cells)
	pad := int(8 * width / step)
	g := grid{from: -float64(pad) * step, step: step}
	total := make([]complex128, cells/2+1)
	for i := range total {
		k := 2 * math.Pi * float64(i) / (float64(cells) * step)
		total[i] = complex(math.Exp(-k*k*width*width/2), 0)
	}
	buffer, transform := make([]float64, cells), make([]complex128, cells/2+1)
	for n, h := range parts {
		g.from += h.from
		clear(buffer)
		from := 0
		if n == 0 {
			from = pad
		}
		copy(buffer[from:], h.values)
		for i, c := range fft.Coefficients(transform, buffer) {
			total[i] *= c
		}
	}
	g.values = fft.Sequence(buffer, total)
	for i, v := range g.values {
		// Rounding leaves ±1e-17 where the density vanishes.
		g.values[i] = max(v/float64(cells)/step, 0)
	}
	return g
}

// density is the probability density of a sum of independent quantities, each
// known by its draws. n draws of each resolve what n² pairs would; smooth tails
// carry it beyond.
type density struct {
	grid
	cumulative   grid // the running integral
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
	variance, shares, n := 0.0, make([]float64, len(parts)), len(parts[0])
	for k, p := range parts {
		_, sd := meanSD(p)
		shares[k] = sd * sd
		variance += sd * sd
		n = min(n, len(p))
	}
	for k := range shares {
		shares[k] /= variance
	}
	width := kernel * math.Sqrt(variance)
	span := 16 * width
	shrunk := make([][]float64, len(parts))
	for k, p := range parts {
		shrunk[k] = shrink(p)
		span += slices.Max(shrunk[k]) - slices.Min(shrunk[k])
	}
	cells := fewestCells
	for cells < mostCells && float64(cells) < 2*span/width {
		cells *= 2
	}
	// Two spare points a part: a histogram is up to two longer than its range.
	step := span / float64(cells-2*len(parts)-2)
	histograms := make([]histogram, len(shrunk))
	for k, p := range shrunk {
		histograms[k] = newHistogram(p, step)
	}
	d := &density{grid: sumDensity(histograms, cells, step, width)}
	d.cumulative = d.cumulate()
	trust := newConfidence(shares, n)
	d.lower = trust.lowerTail(d.cumulative)
	d.upper = trust.lowerTail(d.mirror().cumulate())
	d.upper.x = -d.upper.x
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

// quantiles are the values below which the given shares of the probability lie.
func (d *density) quantiles(shares ...float64) []float64 {
	c := d.cumulative
	out := make([]float64, len(shares))
	for k, p := range shares {
		p *= c.values[len(c.values)-1]
		i := max(sort.SearchFloat64s(c.values, p), 1)
		out[k] = c.x(i) - c.step*(c.values[i]-p)/max(c.values[i]-c.values[i-1], 1e-300)
	}
	return out
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

// log is the logarithm of the density at x.
func (d *density) log(x float64) float64 {
	switch {
	case x < d.lower.x:
		return d.lower.logDensity(d.lower.x - x)
	case x > d.upper.x:
		return d.upper.logDensity(x - d.upper.x)
	}
	return math.Log(d.at(x))
}

// LessLikely is the probability of values less likely than x, and whether a
// fitted tail was used to tell (Raveri & Doux 2021, their eq. for the
// probability mass outside the isodensity contour through x).
func (d *density) LessLikely(x float64) (p float64, fitted bool) {
	if d.order == nil {
		d.rank()
	}
	level := d.log(x)
	fitted = d.lower.x-x > d.lower.resolved || x-d.upper.x > d.upper.resolved
	p = d.lower.lessLikely(level) + d.upper.lessLikely(level)
	rho := math.Exp(level)
	if k := sort.SearchFloat64s(d.order, rho); k > 0 {
		p += d.below[k-1]
	}
	// Nothing here is known to 1e-300; it keeps a significance finite.
	return min(max(p, 1e-300), 1), fitted || rho == 0
}

// tabulate is LessLikely between the smallest and the largest of some values, at
// points 1/20 of a standard deviation apart or closer.
func (d *density) tabulate(values []float64) grid {
	_, sd := meanSD(values)
	from, to := slices.Min(values), slices.Max(values)
	points := int((to-from)/(sd/20)) + 2
	g := grid{from: from, step: (to - from) / float64(points-1), values: make([]float64, points)}
	for i := range g.values {
		g.values[i], _ = d.LessLikely(g.x(i))
	}
	return g
}
