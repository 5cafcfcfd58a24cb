package xray

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/floats"

	"steelyard/probes/constants"
	"steelyard/probes/infer"
)

// gasMass gives the mass of the gas,
//
//	M_gas(<r) = 4π μ_e m_p ∫ n_e r² dr / √C,
//
// for any moves of the density, C being the clumping ⟨n²⟩/⟨n⟩² that makes an
// emission measure overstate the density.
type gasMass struct {
	air     *atmosphere
	weights [][points]float64 // of ∫ 4π r² n̂ dr between the nodes, for the ratios n/n̂
	inside  float64           // the same inside the first node, for its ratio
	ratio   []float64
	ln      []float64 // ln of ∫ n_e dV at the nodes, cm⁻³ kpc³
}

func newGasMass(gas *Gas, air *atmosphere) *gasMass {
	volume := func(r float64) float64 { return 4 * math.Pi * r * r * math.Exp(gas.LnElectrons(r)) }
	r, n := air.grid.r[0], len(air.grid.r)
	return &gasMass{
		air: air, weights: air.grid.steps(volume), inside: volume(r) * r / (3 + gas.Form.slope(gas.Parameters, r)),
		ratio: make([]float64, n), ln: make([]float64, n),
	}
}

// move sets the density to the moves z.
func (m *gasMass) move(z []float64) {
	clear(m.ratio)
	for k, zk := range z {
		floats.AddScaled(m.ratio, zk, m.air.modes[k])
	}
	for j, x := range m.ratio {
		m.ratio[j] = math.Exp(x)
	}
	sum := m.inside * m.ratio[0]
	m.ln[0] = math.Log(sum)
	for j := range m.weights {
		first := m.air.grid.first(j)
		for k, w := range &m.weights[j] {
			sum += w * m.ratio[first+k]
		}
		m.ln[j+1] = math.Log(sum)
	}
}

// within is the mass inside r kpc in Msun for one electron per cm⁻³ weighing
// electron proton masses.
func (m *gasMass) within(r, electron float64) float64 {
	g := m.air.grid
	at := (math.Log(r) - g.ln[0]) / g.step
	first := g.first(min(max(int(at), 0), len(g.r)-2))
	var ln float64
	for k, l := range lagrange(at - float64(first)) {
		ln += l * m.ln[first+k]
	}
	return math.Exp(ln) * electron * constants.ProtonMassPerCubicKpc
}

// addGas reports the mass of the gas inside each draw's own r_500 and its share
// of the mass there.
func (f *fit) addGas(d *infer.Draws, sample *infer.Sample) {
	threshold := 500 * f.task.Cosmology.CriticalDensity(f.task.Object.Redshift)
	rng := f.task.Sampling.Stream.Sub("gas mass").Rand(0)
	draw := func(name string) func() float64 {
		v := f.task.Settings[name]
		return func() float64 {
			if v.Prior.IsExact() {
				return v.Prior.A
			}
			return v.Prior.FromScore(rng.NormFloat64())
		}
	}
	electron, clumping := draw("electron_molecular_weight"), draw("clumping")
	m, first := newGasMass(f.gas, f.air), len(f.parameters.Free)
	mass, share, radius := make([]float64, d.N), make([]float64, d.N), make([]float64, d.N)
	for i, theta := range sample.Values {
		r, ok := d.RadiusAt(i, threshold)
		if !ok {
			return // no r_500 within the grid: nothing to report
		}
		m.move(theta[first:])
		radius[i] = r
		mass[i] = m.within(r, electron()) / math.Sqrt(clumping())
		share[i] = mass[i] / (4 * math.Pi / 3 * threshold * r * r * r)
	}
	d.Parameters = append(d.Parameters,
		infer.Parameter{Name: "gas_mass_500c", Unit: "solMass", Values: mass},
		infer.Parameter{Name: "gas_fraction_500c", Values: share})
	if r := infer.Percentiles(radius, 50)[0]; f.gas.Outer > 0 && r > f.gas.Outer {
		d.Warnings = append(d.Warnings, fmt.Sprintf("gas_mass_500c and gas_fraction_500c are extrapolated: r_500 is %.4g kpc and the density data end at %.4g kpc", r, f.gas.Outer))
	}
}
