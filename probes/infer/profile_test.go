package infer

import (
	"math"
	"testing"
)

// nfw is ln M(<r) of an NFW halo of scale radius rs and characteristic density
// rho (Navarro, Frenk & White 1997).
func nfw(r, rs, rho float64) float64 {
	x := r / rs
	return math.Log(4 * math.Pi * rho * rs * rs * rs * (math.Log1p(x) - x/(1+x)))
}

func profileDraws(rs ...float64) *Draws {
	d := &Draws{N: len(rs), Radii: Grid()}
	for _, s := range rs {
		for _, r := range d.Radii {
			d.LnMass = append(d.LnMass, nfw(r, s, 1e6))
		}
	}
	return d
}

// The grid must be fine enough that interpolation errs by less than 1e-4 for
// any halo; measured here for scale radii from a dwarf's to a cluster's.
func TestLnMassInterpolatesNFW(t *testing.T) {
	scales := []float64{2, 20, 100, 350, 1000, 5000}
	d := profileDraws(scales...)
	worst := 0.0
	for i, rs := range scales {
		for r := 1.0; r < 30000; r *= 1.013 {
			got := d.LnMassAt(i, math.Log(r))
			worst = max(worst, math.Abs(got-nfw(r, rs, 1e6)))
		}
	}
	t.Logf("largest error in ln M: %.2g", worst)
	if worst > 1e-5 {
		t.Errorf("interpolation errs by %.2g in ln M", worst)
	}
}

func TestLnMassAtGridPointsAndBeyond(t *testing.T) {
	d := profileDraws(350, 100)
	for j, r := range d.Radii {
		if got, want := d.LnMassAt(1, math.Log(r)), d.LnMass[len(d.Radii)+j]; math.Abs(got-want) > 1e-12 {
			t.Fatalf("at %g kpc %v, stored %v", r, got, want)
		}
	}
	if math.IsNaN(d.LnMassAt(0, math.Log(30000))) || math.IsNaN(d.LnMassAt(0, 0)) {
		t.Error("an end of the grid counts as outside")
	}
	for _, lnR := range []float64{-0.01, math.Log(30001), math.NaN()} {
		if got := d.LnMassAt(0, lnR); !math.IsNaN(got) {
			t.Errorf("outside the grid, at ln r = %g: %g, want NaN", lnR, got)
		}
		if _, ok := d.LnMassesAt(lnR); ok {
			t.Errorf("LnMassesAt accepts ln r = %g", lnR)
		}
	}
	all, ok := d.LnMassesAt(6.5)
	if !ok || all[0] != d.LnMassAt(0, 6.5) || all[1] != d.LnMassAt(1, 6.5) {
		t.Errorf("LnMassesAt gives %v, %t", all, ok)
	}
	one := &Draws{N: 1, Radii: []float64{500}, LnMass: []float64{33}}
	if got := one.LnMassAt(0, math.Log(500)); got != 33 {
		t.Errorf("a grid of one radius gives %g", got)
	}
}

// The radius of a mean density, against a bisection on the closed form.
func TestRadiusAt(t *testing.T) {
	scales := []float64{100, 350}
	d := profileDraws(scales...)
	for i, rs := range scales {
		for _, threshold := range []float64{25000, 1e5, 3e5} {
			lo, hi := 1.0, 30000.0
			for range 80 {
				mid := math.Sqrt(lo * hi)
				if nfw(mid, rs, 1e6) > math.Log(4*math.Pi/3*threshold*mid*mid*mid) {
					lo = mid
				} else {
					hi = mid
				}
			}
			got, ok := d.RadiusAt(i, threshold)
			// An error ε in ln M moves ln r by ε/(3 − dlnM/dlnr), about ε/2.
			if !ok || math.Abs(math.Log(got/lo)) > 1e-5 {
				t.Errorf("rs = %g, threshold %g: %g %t, want %g", rs, threshold, got, ok, lo)
			}
		}
	}
}

func TestRadiusAtSaysWhenThereIsNone(t *testing.T) {
	d := profileDraws(350)
	for _, threshold := range []float64{1e12, 1e-6, 0, -1, math.NaN()} {
		if r, ok := d.RadiusAt(0, threshold); ok {
			t.Errorf("threshold %g: found %g kpc", threshold, r)
		}
	}
	// A mean density that falls, rises and falls again: the inner radius is
	// taken. ln ρ̄ is linear between the nodes of this grid of decades.
	w := &Draws{N: 1, Radii: []float64{1, 10, 100, 1000, 10000, 100000}}
	for j, lnRho := range []float64{5, 2, -2, 2, -2, -5} {
		w.LnMass = append(w.LnMass, lnRho+3*math.Log(w.Radii[j])+math.Log(4*math.Pi/3))
	}
	if r, ok := w.RadiusAt(0, 1); !ok || r < 10 || r > 100 {
		t.Errorf("innermost crossing at %g kpc, %t; want it between 10 and 100", r, ok)
	}
}

func TestParameter(t *testing.T) {
	d := &Draws{N: 1, Parameters: []Parameter{{Name: "mass_200c"}}, Nuisances: []Parameter{{Name: "shear_bias"}}}
	if p := d.Parameter("mass_200c"); p != &d.Parameters[0] {
		t.Errorf("mass_200c: %v", p)
	}
	if p := d.Parameter("shear_bias"); p != &d.Nuisances[0] {
		t.Errorf("shear_bias: %v", p)
	}
	if p := d.Parameter("none"); p != nil {
		t.Errorf("none: %v", p)
	}
}
