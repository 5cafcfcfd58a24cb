package dynamics

import (
	"math"

	"steelyard/probes/constants"
)

// amplitude is the half width A(R) in km/s of the region of the diagram that
// galaxies bound to the cluster fill, at the radii of the diagram.
type amplitude []float64

// caustics returns the amplitude at the density κ for which the mean square of
// the escape speed it stands for is four times the members' mean square
// velocity, as for a system in equilibrium,
//
//	∫_0^R A² φ dr / ∫_0^R φ dr = 4 ⟨v²⟩,  φ = ∫ f dv
//
// with R the members' mean projected radius (Diaferio 1999, eqs. 17 and 18).
// False when no density does.
func caustics(d *diagram, density [][]float64, radius, square float64) (amplitude, bool) {
	highest := 0.0
	for _, row := range density {
		for _, f := range row {
			highest = max(highest, f)
		}
	}
	if highest == 0 {
		return nil, false
	}
	excess := func(lnKappa float64) float64 {
		a := contour(d, density, math.Exp(lnKappa))
		var above, below float64
		for k, v := range a {
			if d.radiusOf(k) > radius {
				break
			}
			phi := 0.0
			for _, f := range density[k] {
				phi += f
			}
			above += v * v * phi
			below += phi
		}
		return above/below - 4*square
	}
	// The amplitude falls as κ rises.
	lo, hi := math.Log(highest)-18, math.Log(highest)
	if !(excess(lo) > 0 && excess(hi) < 0) {
		return nil, false
	}
	for range 40 {
		if mid := (lo + hi) / 2; excess(mid) > 0 {
			lo = mid
		} else {
			hi = mid
		}
	}
	return contour(d, density, math.Exp((lo+hi)/2)), true
}

// contour follows the density κ outwards from the mean velocity on both sides
// and takes the nearer side. The amplitude of a real cluster does not rise faster
// than as R^(1/4); where the contour does, interlopers draw it out and it is held
// to that (Diaferio 1999, section 4.3).
func contour(d *diagram, density [][]float64, kappa float64) amplitude {
	const steepest = 0.25
	a := make(amplitude, diagramRadii)
	for k, row := range density {
		a[k] = math.Min(crossing(d, row, kappa, 1), crossing(d, row, kappa, -1))
		if k > 0 && a[k-1] > 0 {
			a[k] = math.Min(a[k], a[k-1]*math.Pow(d.radiusOf(k)/d.radiusOf(k-1), steepest))
		}
	}
	return a
}

// crossing is how far from zero velocity the density first falls below κ.
func crossing(d *diagram, row []float64, kappa float64, side int) float64 {
	at := diagramVelocities / 2
	if side < 0 {
		at--
	}
	for ; at >= 0 && at < diagramVelocities; at += side {
		if row[at] >= kappa {
			continue
		}
		before := at - side
		if before < 0 || before >= diagramVelocities || row[before] < kappa {
			return 0 // below κ from the start
		}
		part := (row[before] - kappa) / (row[before] - row[at])
		return math.Max(0, math.Abs(d.velocityOf(before)+part*(d.velocityOf(at)-d.velocityOf(before))))
	}
	return d.window
}

// CausticMass is F_β/G ∫_0^r A² dr in Msun at each of the rising radii in kpc,
// for an amplitude in km/s at those radii. Between them A² is taken as linear and
// inside the first as constant.
func CausticMass(radii, amplitude []float64, fillingFactor float64) []float64 {
	mass := make([]float64, len(radii))
	sum := radii[0] * amplitude[0] * amplitude[0]
	for i := range radii {
		if i > 0 {
			sum += (radii[i] - radii[i-1]) * (amplitude[i]*amplitude[i] + amplitude[i-1]*amplitude[i-1]) / 2
		}
		mass[i] = fillingFactor / constants.G * sum
	}
	return mass
}

// at reads the amplitude between the diagram's radii.
func (a amplitude) at(d *diagram, radius float64) float64 {
	x := min(max(radius/d.edge*diagramRadii-0.5, 0), diagramRadii-1)
	k := min(int(x), diagramRadii-2)
	part := x - float64(k)
	return (1-part)*a[k] + part*a[k+1]
}
