package dynamics

import (
	"math"
)

// diagram is the galaxies of a field in the plane of projected radius and
// velocity, with their density there (Diaferio 1999).
//
// Radii are multiplied by 25 × 100 h km/s/Mpc, so that the smoothing is 25 times
// wider in velocity than in Hubble flow. Galaxies are mirrored at R = 0.
type diagram struct {
	radius, velocity []float64 // kpc and km/s, one a galaxy
	width            []float64 // smoothing length of each, km/s
	perKpc           float64   // km/s a kpc of the scaled radius

	edge, window float64     // kpc, km/s: the rectangle 0 < R < edge, |v| < window
	density      [][]float64 // by radius, then velocity
}

const (
	diagramRadii      = 50
	diagramVelocities = 160
)

func (d *diagram) radiusOf(k int) float64 { return d.edge * (float64(k) + 0.5) / diagramRadii }
func (d *diagram) velocityOf(l int) float64 {
	return d.window * (2*(float64(l)+0.5)/diagramVelocities - 1)
}

// newDiagram smooths the galaxies with an adaptive kernel, 4/π (1−t²)³ of width
//
//	h_i = h_c h_opt λ_i,  λ_i = [γ/f₁(i)]^½,  h_opt = 3.12 N^(−1/6) [(σ_x²+σ_v²)/2]^½,
//
// f₁ being the density with h_opt for all and γ its geometric mean (Silverman
// 1986, section 5.3). h_c minimises the integrated square error by
// cross-validation.
func newDiagram(radius, velocity []float64, edge, window, hubble float64) *diagram {
	d := &diagram{radius: radius, velocity: velocity, perKpc: 25 * hubble / 1000, edge: edge, window: window}
	n := len(radius)
	_, spreadV := meanAndSpread(velocity, nil)
	square := 0.0 // of the mirrored radii about zero
	for _, r := range radius {
		square += r * r * d.perKpc * d.perKpc / float64(n)
	}
	best := 3.12 * math.Pow(float64(n), -1./6) * math.Sqrt((square+spreadV*spreadV)/2)
	pilot := d.pilot(best)
	mean := 0.0
	for _, f := range pilot {
		mean += math.Log(f) / float64(n)
	}
	lambda := make([]float64, n)
	for i, f := range pilot {
		lambda[i] = math.Exp((mean - math.Log(f)) / 2)
	}
	lowest, chosen := math.Inf(1), 0.0
	for step := range 12 {
		hc := 0.15 * math.Pow(1.2, float64(step))
		d.smooth(lambda, hc*best)
		if e := d.crossValidation(); e < lowest {
			lowest, chosen = e, hc
		}
	}
	d.smooth(lambda, chosen*best)
	return d
}

// pilot is the density at each galaxy, itself included, for one width.
func (d *diagram) pilot(h float64) []float64 {
	f := make([]float64, len(d.radius))
	for i := range d.radius {
		for j := range d.radius {
			dv := (d.velocity[i] - d.velocity[j]) / h
			if dv*dv >= 1 {
				continue
			}
			for _, dx := range [2]float64{(d.radius[i] - d.radius[j]) * d.perKpc / h, (d.radius[i] + d.radius[j]) * d.perKpc / h} {
				f[i] += kernel(dx*dx + dv*dv)
			}
		}
	}
	return f
}

// kernel is (1−t²)³ as a function of t², without its norm.
func kernel(t2 float64) float64 {
	if t2 >= 1 {
		return 0
	}
	k := 1 - t2
	return k * k * k
}

// smooth chooses the widths and adds the galaxies up. No kernel is narrower than
// two cells, which the grid could not hold.
func (d *diagram) smooth(lambda []float64, width float64) {
	least := 2 * math.Max(d.edge/diagramRadii*d.perKpc, 2*d.window/diagramVelocities)
	d.width = make([]float64, len(lambda))
	for i, l := range lambda {
		d.width[i] = math.Max(l*width, least)
	}
	d.density = d.sum(nil)
}

// sum adds the kernels up, each galaxy's as often as counts says, once for nil.
func (d *diagram) sum(counts []int) [][]float64 {
	f := make([][]float64, diagramRadii)
	for k := range f {
		f[k] = make([]float64, diagramVelocities)
	}
	stepR, stepV := d.edge/diagramRadii, 2*d.window/diagramVelocities
	for i, h := range d.width {
		times := float64(count(counts, i))
		if times == 0 {
			continue
		}
		norm := times * 4 / (math.Pi * h * h)
		for _, r := range [2]float64{d.radius[i], -d.radius[i]} {
			reach := h / d.perKpc
			for k := max(0, int((r-reach)/stepR)); k < diagramRadii && d.radiusOf(k) < r+reach; k++ {
				dx := (d.radiusOf(k) - r) * d.perKpc / h
				near := 1 - dx*dx
				half := h * math.Sqrt(math.Max(0, near))
				first := max(0, int((d.velocity[i]-half+d.window)/stepV-0.5))
				last := min(diagramVelocities-1, int((d.velocity[i]+half+d.window)/stepV))
				dv := (d.velocityOf(first) - d.velocity[i]) / h
				row := f[k]
				for l := first; l <= last; l++ {
					if t := near - dv*dv; t > 0 {
						row[l] += norm * t * t * t
					}
					dv += stepV / h
				}
			}
		}
	}
	return f
}

// crossValidation is ∫f² − (2/N) Σ f₋ᵢ(i) up to what does not change with the
// widths, f₋ᵢ being the density without galaxy i at its place.
func (d *diagram) crossValidation() float64 {
	n := float64(len(d.radius))
	stepR, stepV := d.edge/diagramRadii*d.perKpc, 2*d.window/diagramVelocities
	square := 0.0
	for _, row := range d.density {
		for _, f := range row {
			square += f * f
		}
	}
	others := 0.0
	for i := range d.radius {
		own := 4 / (math.Pi * d.width[i] * d.width[i])
		x := 2 * d.radius[i] * d.perKpc / d.width[i]
		own += own * kernel(x*x) // its mirror image
		others += d.at(d.radius[i], d.velocity[i]) - own
	}
	return square*stepR*stepV/(n*n) - 2*others/(n*n)
}

// at reads the density between the cells.
func (d *diagram) at(radius, velocity float64) float64 {
	x := min(max(radius/d.edge*diagramRadii-0.5, 0), diagramRadii-1)
	y := min(max((velocity/d.window+1)/2*diagramVelocities-0.5, 0), diagramVelocities-1)
	k, l := min(int(x), diagramRadii-2), min(int(y), diagramVelocities-2)
	a, b := x-float64(k), y-float64(l)
	return (1-a)*((1-b)*d.density[k][l]+b*d.density[k][l+1]) + a*((1-b)*d.density[k+1][l]+b*d.density[k+1][l+1])
}
