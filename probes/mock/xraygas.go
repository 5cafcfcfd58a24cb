package mock

import (
	"math"

	"steelyard/probes/constants"
)

// Gas says what gas to put into a halo. It rests in equilibrium there, its
// pressure falling to nothing at infinity, unless Edge is set: beyond Edge the
// thermal pressure is then Share times the weight of the gas above, something
// else carrying the rest.
type Gas struct {
	Electrons           func(r float64) float64 // n_e in cm⁻³ at r kpc
	MeanMolecularWeight float64                 // 0 stands for 0.6
	Nonthermal          float64                 // constant share of the pressure that is not thermal
	Edge                float64                 // kpc; 0 for none
	Share               float64
}

// VikhlininGas is the density of Vikhlinin et al. 2006, eq. 3, for n_p n_e, with
// γ = 3 and n_e = 1.2 n_p; radii in kpc, densities in cm⁻³.
type VikhlininGas struct {
	N0, Rc, Beta, Alpha, Rs, Epsilon float64
	N02, Rc2, Beta2                  float64 // no second component with N02 = 0
}

// Electrons is n_e in cm⁻³ at r kpc.
func (g VikhlininGas) Electrons(r float64) float64 {
	square := g.N0 * g.N0 * math.Pow(r/g.Rc, -g.Alpha) /
		math.Pow(1+math.Pow(r/g.Rc, 2), 3*g.Beta-g.Alpha/2)
	if g.Epsilon != 0 {
		square /= math.Pow(1+math.Pow(r/g.Rs, 3), g.Epsilon/3)
	}
	if g.N02 > 0 {
		square += g.N02 * g.N02 / math.Pow(1+math.Pow(r/g.Rc2, 2), 3*g.Beta2)
	}
	return math.Sqrt(1.2 * square)
}

// Atmosphere is gas at rest in a halo.
type Atmosphere struct {
	gas      Gas
	lnWeight []float64 // ln of the weight of the gas above, at radii of even spacing in ln r
	lnLow    float64
	lnStep   float64
	edge     float64 // the weight above Edge
}

// Atmosphere puts the gas to rest by marching along the radius: the mass
// outwards, the pressure inwards, with Simpson's rule over each step of ln r
// from 1e-3 kpc to 1e6 kpc. The temperatures err by less than 1e-8 of
// themselves between 1 kpc and 30 Mpc.
func (t Truth) Atmosphere(g Gas) *Atmosphere {
	if g.MeanMolecularWeight == 0 {
		g.MeanMolecularWeight = 0.6
	}
	const steps, low, high = 6000, 1e-3, 1e6
	h := t.Halo()
	a := &Atmosphere{gas: g, lnLow: math.Log(low), lnStep: math.Log(high/low) / steps}
	at := func(i float64) float64 { return math.Exp(a.lnLow + i*a.lnStep) }
	shell := func(i float64) float64 { r := at(i); return 4 * math.Pi * r * r * r * h.Density(r) }
	// The mass at every step and half step.
	mass := make([]float64, 2*steps+1)
	mass[0] = h.Mass(low)
	for i := 1; i <= 2*steps; i++ {
		x := float64(i) / 2
		mass[i] = mass[i-1] + a.lnStep/12*(shell(x-0.5)+4*shell(x-0.25)+shell(x))
	}
	// dP_e/d ln r of the thermal pressure n_e kT.
	strength := g.MeanMolecularWeight * (1 - g.Nonthermal) / constants.HydrostaticMass
	fall := func(i int) float64 {
		r := at(float64(i) / 2)
		return strength * g.Electrons(r) * mass[i] / r
	}
	weight := make([]float64, steps+1) // keV cm⁻³
	for i := steps - 1; i >= 0; i-- {
		weight[i] = weight[i+1] + a.lnStep/6*(fall(2*i)+4*fall(2*i+1)+fall(2*i+2))
	}
	a.lnWeight = make([]float64, steps)
	for i := range a.lnWeight {
		a.lnWeight[i] = math.Log(weight[i])
	}
	if g.Edge > 0 {
		a.edge = a.weight(g.Edge)
	}
	return a
}

// weight is the weight of the gas above r kpc, in keV cm⁻³.
func (a *Atmosphere) weight(r float64) float64 {
	return math.Exp(interpolateSmooth(a.lnWeight, (math.Log(r)-a.lnLow)/a.lnStep))
}

// Temperature is kT in keV at r kpc.
func (a *Atmosphere) Temperature(r float64) float64 {
	p := a.weight(r)
	switch {
	case a.gas.Edge > 0 && r < a.gas.Edge:
		p += (a.gas.Share - 1) * a.edge
	case a.gas.Edge > 0:
		p *= a.gas.Share
	}
	return p / a.gas.Electrons(r)
}

// interpolateSmooth reads a table between its entries by cubics.
func interpolateSmooth(table []float64, at float64) float64 {
	i := min(max(int(at), 1), len(table)-3)
	f := at - float64(i)
	return -f*(f-1)*(f-2)/6*table[i-1] + (f+1)*(f-1)*(f-2)/2*table[i] -
		(f+1)*f*(f-2)/2*table[i+1] + (f+1)*f*(f-1)/6*table[i+2]
}

// Spectral is the temperature in keV that a spectrum of the annulus between
// projected radii r1 and r2 kpc yields: the gas seen there is cut into rings
// and along the line of sight, and every piece counts with n² T^(−3/4)
// (Mazzotta et al. 2004). The sums err by less than 1e-5.
func (a *Atmosphere) Spectral(r1, r2 float64) float64 { return a.spectral(r1, r2, 40, 0.04) }

// farthest is where the line of sight ends, in kpc.
const farthest = 1e5

// spectral cuts the annulus into rings and the line of sight into steps of u,
// l = R sinh u.
func (a *Atmosphere) spectral(r1, r2 float64, rings int, step float64) float64 {
	var hot, cold float64
	width := (r2 - r1) / float64(rings)
	for i := range rings {
		R := r1 + (float64(i)+0.5)*width
		for u := step / 2; ; u += step {
			r := R * math.Cosh(u)
			if r > farthest {
				break
			}
			n, kT := a.gas.Electrons(r), a.Temperature(r)
			piece := R * r * n * n // 2πR dR · dl, dl = R cosh u du; the constants cancel
			hot += piece * math.Pow(kT, 0.25)
			cold += piece * math.Pow(kT, -0.75)
		}
	}
	return hot / cold
}

// Shell is the root mean square n_e in cm⁻³ between r1 and r2 kpc, which is what
// an emission measure yields.
func (a *Atmosphere) Shell(r1, r2 float64) float64 {
	const cuts = 400
	var sum, volume float64
	width := (r2 - r1) / cuts
	for i := range cuts {
		r := r1 + (float64(i)+0.5)*width
		n := a.gas.Electrons(r)
		sum += r * r * n * n
		volume += r * r
	}
	return math.Sqrt(sum / volume)
}

// FineSpectral is Spectral with finer cuts, to 1e-8 away from the centre.
func (a *Atmosphere) FineSpectral(r1, r2 float64) float64 {
	coarse, fine := a.spectral(r1, r2, 75, 0.04), a.spectral(r1, r2, 150, 0.04)
	return fine + (fine-coarse)/3
}

// ShellTemperature is what a spectrum of the spherical shell between r1 and r2
// kpc would yield.
func (a *Atmosphere) ShellTemperature(r1, r2 float64) float64 {
	const cuts = 2000
	var hot, cold float64
	for i := range cuts {
		r := r1 + (r2-r1)*(float64(i)+0.5)/cuts
		n, kT := a.gas.Electrons(r), a.Temperature(r)
		hot += r * r * n * n * math.Pow(kT, 0.25)
		cold += r * r * n * n * math.Pow(kT, -0.75)
	}
	return hot / cold
}
