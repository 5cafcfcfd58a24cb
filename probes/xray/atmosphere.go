package xray

import (
	"math"

	"steelyard/probes/constants"
)

// atmosphere is gas in hydrostatic equilibrium in a spherical mass, seen in
// bins. Everything that does not change from one likelihood to the next is
// worked out beforehand.
//
// With p = n_e kT (the electrons' share of the pressure; the share cancels),
//
//	dp/dr = −μ n_e M(<r) / (H r²),   H = 1 keV kpc/(G m_p),
//
// for the whole pressure p = n_e kT/(1 − f), f being the share that is not
// thermal. W(r) is the weight of the gas above r, −dp/dr integrated from r to
// infinity. At r_e, the outer edge of the temperature data, the pressure is
// free: p(r_e) = η W(r_e). Inside, p(r) = p(r_e) + W(r) − W(r_e). Outside no
// data say what holds the gas up, and its temperature enters only through the
// line of sight; there the pressure is taken to be the same share η of the
// weight, p(r) = η W(r), which joins on and is exact where equilibrium holds to
// infinity (η = 1).
type atmosphere struct {
	grid *radial
	// modes is what the directions of the density's errors add to ln of the
	// density over the reference, at the nodes.
	modes [][]float64
	// gravity integrates the reference density over the nodes' (n/n̂)(M/r).
	gravity [][points]float64
	lnRef   []float64 // ln n̂ at the nodes
	ref     []float64 // n̂ at the nodes
	bins    []seen
}

// seen is one bin: the weights of the nodes from first on, with the reference
// density squared inside.
type seen struct {
	first  int
	weight []float64
}

// newAtmosphere prepares the gas for the spectra's bins, density being the
// nodes per factor e of radius.
func newAtmosphere(gas *Gas, s *Spectra, density float64) *atmosphere {
	n := s.Len()
	inner := s.Inner[0]
	if inner == 0 {
		inner = s.Outer[0]
	}
	a := &atmosphere{grid: newRadial(inner, s.Outer[n-1], density)}
	g := a.grid
	reference := func(r float64) float64 { return math.Exp(gas.LnElectrons(r)) }
	emission := func(r float64) float64 { return math.Exp(2 * gas.LnElectrons(r)) }
	for _, r := range g.r {
		a.lnRef = append(a.lnRef, gas.LnElectrons(r))
		a.ref = append(a.ref, reference(r))
	}
	a.gravity = g.steps(func(r float64) float64 { return reference(r) / r })
	weight := g.shell
	if s.Projected {
		weight = g.annulus
	}
	var weights [][]float64
	for i := range s.Value {
		weights = append(weights, weight(s.Inner[i], s.Outer[i], emission))
	}
	if s.Mixing != nil {
		weights = mix(s.Mixing, weights)
	}
	for _, w := range weights {
		a.bins = append(a.bins, sparse(w))
	}
	return a
}

// sparse drops the zeros before the first node that a bin sees.
func sparse(w []float64) seen {
	first, last := 0, len(w)
	for w[first] == 0 {
		first++
	}
	for w[last-1] == 0 {
		last--
	}
	return seen{first, w[first:last]}
}

// state is the scratch space of one goroutine, and what a call leaves behind.
type state struct {
	mass     []float64 // M(<r) at the nodes, Msun: set by the caller
	thermal  []float64 // 1 − f at the nodes: set by the caller
	ratio    []float64 // n_e over the reference
	weight   []float64 // W at the nodes, keV cm⁻³
	pressure []float64 // n_e kT at the nodes, keV cm⁻³
	kT       []float64 // keV at the nodes
	hot      []float64 // emission × T^(1/4)
	cold     []float64 // emission × T^(−3/4)
	quotient []float64
	Bins     []float64 // spectroscopic-like kT of every bin, keV
}

func (a *atmosphere) newState() *state {
	n := len(a.grid.r)
	rows := make([]float64, 9*n)
	row := func(i int) []float64 { return rows[i*n : (i+1)*n : (i+1)*n] }
	return &state{row(0), row(1), row(2), row(3), row(4), row(5), row(6), row(7), row(8), make([]float64, len(a.bins))}
}

// solve sets the temperatures for the mass and the thermal share in s, the mean
// molecular weight, the outer pressure η and the density's moves z. It reports
// false when no temperature is positive and finite.
func (a *atmosphere) solve(s *state, molecule, eta float64, z []float64) bool {
	a.move(s, z)
	n := len(s.ratio)
	for j, ratio := range s.ratio {
		s.quotient[j] = ratio * s.mass[j] / a.grid.r[j]
	}
	strength := molecule / constants.HydrostaticMass
	last := n - 1
	above := a.beyond(s)
	if !(above > 0) {
		return false // the gas above has no finite weight
	}
	s.weight[last] = strength * above
	for j := last - 1; j >= 0; j-- {
		var step float64
		first := a.grid.first(j)
		for k, w := range &a.gravity[j] {
			step += w * s.quotient[first+k]
		}
		s.weight[j] = s.weight[j+1] + strength*step
	}
	missing := (eta - 1) * s.weight[a.grid.edge]
	for j, w := range s.weight {
		if j < a.grid.edge {
			s.pressure[j] = s.thermal[j] * (w + missing)
		} else {
			s.pressure[j] = s.thermal[j] * eta * w
		}
		s.kT[j] = s.pressure[j] / (s.ratio[j] * a.ref[j])
		if !(s.kT[j] > 0) || math.IsInf(s.kT[j], 1) {
			return false
		}
	}
	a.look(s)
	return true
}

// move sets the density to the moves z.
func (a *atmosphere) move(s *state, z []float64) {
	clear(s.ratio)
	for k, zk := range z {
		for j, phi := range a.modes[k] {
			s.ratio[j] += zk * phi
		}
	}
	for j, x := range s.ratio {
		s.ratio[j] = math.Exp(x)
	}
}

// beyond is ∫ n_e M/r² dr beyond the last node: with x = ln r and F the ln of
// the integrand r n_e M/r², ∫ e^F dx = −e^F/F′ · (1 + F″/F′² + …). It is not
// positive where the integral has no end.
func (a *atmosphere) beyond(s *state) float64 {
	last := len(s.quotient) - 1
	f := func(j int) float64 { return a.lnRef[j] + math.Log(s.quotient[j]) }
	f0, f1, f2 := f(last), f(last-1), f(last-2)
	h := a.grid.step
	slope, bend := (3*f0-4*f1+f2)/(2*h), (f0-2*f1+f2)/(h*h)
	if slope > -0.1 {
		return -1
	}
	return math.Exp(f0) / -slope * (1 + bend/(slope*slope))
}

// look averages the temperature over every bin with the weight n² T^(−3/4)
// that makes the average the temperature a spectrum yields (Mazzotta et al.
// 2004).
func (a *atmosphere) look(s *state) {
	for j, kT := range s.kT {
		s.hot[j] = s.ratio[j] * s.ratio[j] * math.Sqrt(math.Sqrt(kT))
		s.cold[j] = s.hot[j] / kT
	}
	for i, b := range a.bins {
		var hot, cold float64
		h, c := s.hot[b.first:], s.cold[b.first:]
		for j, w := range b.weight {
			hot += w * h[j]
			cold += w * c[j]
		}
		s.Bins[i] = hot / cold
	}
}
