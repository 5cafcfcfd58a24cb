package xray

import (
	"fmt"
	"math"

	"steelyard/probes/constants"
	"steelyard/probes/infer"
)

// slopes gives the mass of a draw from the slopes of its density and
// temperature, at fixed radii.
type slopes struct {
	*forwardFit
	inside slopeTable // radii in the data, where the mass must rise
	grid   slopeTable // radii of the result
}

// slopeTable holds d ln n_e/d ln r at some radii, and its moves.
type slopeTable struct {
	ln    []float64
	base  []float64
	moves [][]float64
}

// checks is the number of radii inside the data at which the mass must rise.
const checks = 30

func (w *forwardFit) newSlopes() *slopes {
	covers := w.covers()
	// The first bin's gas lies about its middle.
	from := math.Log((w.spectra.Inner[0] + w.spectra.Outer[0]) / 2)
	to := math.Log(covers[1])
	var lnInside, lnGrid []float64
	for i := range checks {
		lnInside = append(lnInside, from+(to-from)*float64(i)/(checks-1))
	}
	for _, r := range infer.Grid() {
		lnGrid = append(lnGrid, math.Log(r))
	}
	table := func(ln []float64) slopeTable {
		t := slopeTable{ln: ln, moves: make([][]float64, len(w.gas.Moves))}
		for _, x := range ln {
			r := math.Exp(x)
			t.base = append(t.base, w.gas.Form.slope(w.gas.Parameters, r))
			for k := range t.moves {
				t.moves[k] = append(t.moves[k], w.gas.ModeSlope(k, r))
			}
		}
		return t
	}
	return &slopes{w, table(lnInside), table(lnGrid)}
}

// mass is the mass in Msun at entry i of the table, for gas all of whose
// pressure is thermal but for the share that support gives at r/r200m; not
// positive where the pressure rises outwards.
func (m *slopes) mass(theta []float64, t *temperature, at *slopeTable, i int, r200m float64) float64 {
	r := math.Exp(at.ln[i])
	thermal, bend := m.support.thermal(theta, r/r200m)
	// The whole pressure is n_e kT/(1 − f).
	slope := at.base[i] + t.slope(at.ln[i]) - bend
	for k, z := range theta[len(m.parameters.Free):] {
		slope += z * at.moves[k][i]
	}
	return -constants.HydrostaticMass / (m.molecule.Of(theta) * thermal) * t.kT(at.ln[i]) * r * slope
}

// radius200m is r_200m of the draw, which the radial share of the pressure
// needs: found from the mass that the share itself gives, by going round until
// it settles. 1 where the share is constant; not positive where it has none.
func (m *slopes) radius200m(theta []float64, t *temperature) float64 {
	if !m.support.radial {
		return 1
	}
	r := 1000.0
	for range 30 {
		last := r
		// The outermost radius inside which the mean density is high enough.
		inside := -1
		var excess [2]float64
		for i := len(m.grid.ln) - 1; i >= 0; i-- {
			volume := 4 * math.Pi / 3 * math.Exp(3*m.grid.ln[i]) * m.support.threshold
			e := math.Log(m.mass(theta, t, &m.grid, i, last) / volume)
			if e >= 0 {
				inside, excess[0] = i, e
				break
			}
			excess[1] = e
		}
		if inside < 0 || inside == len(m.grid.ln)-1 || math.IsNaN(excess[1]) {
			return 0
		}
		step := m.grid.ln[inside+1] - m.grid.ln[inside]
		r = math.Exp(m.grid.ln[inside] + step*excess[0]/(excess[0]-excess[1]))
		if math.Abs(r/last-1) < 1e-6 {
			break
		}
	}
	return r
}

// rises reports whether the mass is positive and rises at all radii inside the
// data.
func (m *slopes) rises(theta []float64) bool {
	t := m.form.at(theta)
	r200m := m.radius200m(theta, &t)
	last := 0.0
	for i := range m.inside.ln {
		mass := m.mass(theta, &t, &m.inside, i, r200m)
		if !(mass > last && r200m > 0) {
			return false
		}
		last = mass
	}
	return true
}

// lnMass fills out with ln of the mass at the radii of the result. Outside the
// data the forms' mass is followed as long as it rises, no faster than r³;
// where it does not, it stays.
func (m *slopes) lnMass(theta, radii, out []float64) error {
	t := m.form.at(theta)
	r200m := m.radius200m(theta, &t)
	from, to := m.inside.ln[0], m.inside.ln[checks-1]
	first, last := len(radii), -1
	for i, ln := range m.grid.ln {
		out[i] = math.Log(m.mass(theta, &t, &m.grid, i, r200m)) // NaN where negative
		if ln >= from && ln <= to {
			first, last = min(first, i), i
		}
	}
	if last < 0 {
		return fmt.Errorf("no radius of the result lies inside the data, %.4g kpc to %.4g kpc", math.Exp(from), math.Exp(to))
	}
	step := func(i int) float64 { // from i to i+1
		rise, most := out[i+1]-out[i], 3*(m.grid.ln[i+1]-m.grid.ln[i])
		if !(rise > 0) {
			return 0
		}
		return math.Min(rise, most)
	}
	outwards := make([]float64, len(radii))
	for i := range radii[1:] {
		outwards[i] = step(i)
	}
	for i := first - 1; i >= 0; i-- {
		out[i] = out[i+1] - outwards[i]
	}
	for i := last; i < len(radii)-1; i++ {
		out[i+1] = out[i] + outwards[i]
	}
	return nil
}
