package cosmology

import "math"

const (
	growthSteps = 1024
	growthStart = -14.0 // ln a, deep in the matter era when there is no radiation
)

// growthTable holds D and dD/d ln a at equal steps of ln a, today's D being 1.
type growthTable struct{ d, slope [growthSteps + 1]float64 }

// GrowthFactor is the linear growth of matter fluctuations, 1 today: the
// growing solution of
//
//	D″ + (2 + d ln H/d ln a) D′ = (3/2) Ω_m(a) D,   ′ = d/d ln a,
//
// with smooth dark energy and radiation (Peebles 1980, section 10; Linder &
// Jenkins 2003), by fourth-order Runge–Kutta in ln a. Good to 1e-8.
func (c *Cosmology) GrowthFactor(z float64) float64 {
	c.growth.once.Do(c.tabulateGrowth)
	t := &c.growth.table
	const h = -growthStart / growthSteps
	s := (-math.Log1p(z) - growthStart) / h
	if !(z >= 0) || s < 0 {
		return math.NaN()
	}
	i := min(int(s), growthSteps-1)
	u := s - float64(i)
	v := 1 - u // cubic Hermite
	return v*v*((1+2*u)*t.d[i]+u*h*t.slope[i]) + u*u*((1+2*v)*t.d[i+1]-v*h*t.slope[i+1])
}

// tabulateGrowth solves the equation of GrowthFactor from the solution of
// Meszaros 1974 for matter and radiation, D ∝ a + 2q/3.
func (c *Cosmology) tabulateGrowth() {
	t := &c.growth.table
	const h = -growthStart / growthSteps
	a := math.Exp(growthStart)
	t.d[0], t.slope[0] = a+2*c.past.q/3, a
	for i := range growthSteps {
		s, d, v := growthStart+float64(i)*h, t.d[i], t.slope[i]
		k1, l1 := v, c.growthForce(s, d, v)
		k2, l2 := v+h/2*l1, c.growthForce(s+h/2, d+h/2*k1, v+h/2*l1)
		k3, l3 := v+h/2*l2, c.growthForce(s+h/2, d+h/2*k2, v+h/2*l2)
		k4, l4 := v+h*l3, c.growthForce(s+h, d+h*k3, v+h*l3)
		t.d[i+1] = d + h/6*(k1+2*k2+2*k3+k4)
		t.slope[i+1] = v + h/6*(l1+2*l2+2*l3+l4)
	}
	today := t.d[growthSteps]
	for i := range t.d {
		t.d[i] /= today
		t.slope[i] /= today
	}
}

// growthForce is D″ at ln a = s.
func (c *Cosmology) growthForce(s, d, v float64) float64 {
	a := math.Exp(s)
	dark := c.darkEnergy(a)
	matter := c.p.OmegaMatter * a
	curved := c.curvature * a * a
	total := c.radiation + matter + curved + dark // a⁴E²
	w := c.p.W0 + c.p.Wa*(1-a)
	slope := -(4*c.radiation + 3*matter + 2*curved + 3*(1+w)*dark) / (2 * total) // d ln H/d ln a
	return 1.5*matter/total*d - (2+slope)*v
}
