package cosmology

import (
	"fmt"
	"math"
)

// panels is the number of pieces the past is cut into.
const panels = 128

// gauss is the four-point rule of Gauss and Legendre on (0, 1): positions and
// weights (Abramowitz & Stegun 1964, table 25.4).
var gauss = [4]struct{ x, w float64 }{
	{0.5 - 0.8611363115940525752/2, 0.3478548451374538574 / 2},
	{0.5 - 0.3399810435848562648/2, 0.6521451548625461426 / 2},
	{0.5 + 0.3399810435848562648/2, 0.6521451548625461426 / 2},
	{0.5 + 0.8611363115940525752/2, 0.3478548451374538574 / 2},
}

// integrals holds ∫dz/E and ∫dz/((1+z)E) from today to panels+1 equally
// spaced values of the variable
//
//	w = √(1+q) − √(a+q),   q = Ω_r/Ω_m,   a = 1/(1+z),
//
// in which both integrands are smooth from today (w = 0) to the big bang: with
//
//	g = Ω_m + (Ω_k a² + Ω_Λ(a) a⁴)/(a + q)
//
// they are dz/E = 2 dw/√g and dz/((1+z)E) = 2 a dw/√g. Between the values four
// Gauss points from the nearest one suffice. The last panel, next to the big
// bang, is cut again and again in half, for dark energy of unusual w is not
// smooth there.
type integrals struct {
	q, rootQ, rootToday float64 // q, √q, √(1+q)
	end, step           float64 // w of the big bang; width of a panel
	comoving            [panels + 1]float64
	lookback            [panels + 1]float64
}

// piece integrates over a width h of w, from where √(a+q) − √q is y.
func (c *Cosmology) piece(y, h float64) (comoving, lookback float64) {
	p := &c.past
	for _, n := range gauss {
		v := y - h*n.x
		a := v * (v + 2*p.rootQ)
		g := c.p.OmegaMatter + (c.curvature*a*a+c.darkEnergy(a))/(a+p.q)
		f := n.w / math.Sqrt(g)
		comoving += f
		lookback += f * a
	}
	return 2 * h * comoving, 2 * h * lookback
}

// toBigBang integrates from y, in the last panel, to the end.
func (c *Cosmology) toBigBang(y float64) (comoving, lookback float64) {
	for range 60 {
		y /= 2
		x, t := c.piece(2*y, y)
		comoving, lookback = comoving+x, lookback+t
	}
	return comoving, lookback
}

// since returns ∫dz/E and ∫dz/((1+z)E) from today to z.
func (c *Cosmology) since(z float64) (comoving, lookback float64) {
	p := &c.past
	if !(z >= 0) {
		return math.NaN(), math.NaN()
	}
	if math.IsInf(z, 1) {
		return p.comoving[panels], p.lookback[panels]
	}
	a := 1 / (1 + z)
	w := z * a / (p.rootToday + math.Sqrt(a+p.q)) // loses no digit at small z
	i := int(w/p.step + 0.5)
	if i >= panels {
		x, t := c.toBigBang(p.end - w)
		return p.comoving[panels] - x, p.lookback[panels] - t
	}
	edge := float64(i) * p.step
	x, t := c.piece(p.end-edge, w-edge)
	return p.comoving[i] + x, p.lookback[i] + t
}

// tolerance bounds what halving the panels may change in an integral.
const tolerance = 1e-12

// tabulate fills the table and verifies it.
func (c *Cosmology) tabulate() error {
	p := &c.past
	p.q = c.radiation / c.p.OmegaMatter
	p.rootQ, p.rootToday = math.Sqrt(p.q), math.Sqrt(1+p.q)
	p.end = 1 / (p.rootToday + p.rootQ)
	p.step = p.end / panels
	var doubt float64
	for i := range panels {
		y := p.end - float64(i)*p.step
		var x, t float64
		if i == panels-1 {
			x, t = c.toBigBang(p.step)
		} else {
			x0, t0 := c.piece(y, p.step/2)
			x1, t1 := c.piece(y-p.step/2, p.step/2)
			x, t = x0+x1, t0+t1
			whole, _ := c.piece(y, p.step)
			doubt += math.Abs(whole - x)
		}
		if !(x > 0) || math.IsInf(x, 0) {
			y -= p.step / 2
			a := y * (y + 2*p.rootQ)
			return fmt.Errorf("cosmology: with omega_matter = %g and omega_lambda = %g the expansion stands still near z = %.2g, so there was no big bang; bring omega_lambda nearer to 1 - omega_matter", c.p.OmegaMatter, c.p.OmegaLambda, 1/a-1)
		}
		p.comoving[i+1] = p.comoving[i] + x
		p.lookback[i+1] = p.lookback[i] + t
	}
	if doubt > tolerance*p.comoving[panels] {
		return fmt.Errorf("cosmology: with omega_matter = %g and omega_lambda = %g the expansion came so close to a halt that distances cannot be computed; bring omega_lambda nearer to 1 - omega_matter", c.p.OmegaMatter, c.p.OmegaLambda)
	}
	return nil
}
