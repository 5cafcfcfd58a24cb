package xray

import (
	"fmt"
	"math"
	"testing"
)

func TestModifiedBetaReference(t *testing.T) {
	ref, gas := readReference(t)
	for _, row := range ref.Profile {
		at := fmt.Sprintf(" at %g kpc", row.R)
		near(t, "n_e"+at, math.Exp(gas.LnElectrons(row.R)), row.Electrons, 1e-12)
		slope, _ := gas.Slope(row.R)
		near(t, "slope"+at, slope, row.DensitySlope, 1e-11)
	}
}

// The slope of every form is the derivative of its density.
func TestSlopes(t *testing.T) {
	for form, p := range map[Form][]float64{
		Beta:         {0.01, 120, 0.6},
		DoubleBeta:   {0.03, 30, 0.9, 0.005, 250, 0.7},
		ModifiedBeta: {0.01, 120, 0.6, 0.9, 1000, 2, 2.5, 0.03, 20, 1},
	} {
		for _, r := range []float64{1, 20, 120, 700, 3000} {
			const h = 1e-5
			derivative := (form.lnElectrons(p, r*math.Exp(h)) - form.lnElectrons(p, r*math.Exp(-h))) / (2 * h)
			// Central differences err by h² and by rounding over h, 1e-10.
			if got := form.slope(p, r); math.Abs(got-derivative) > 1e-9 {
				t.Errorf("%s: slope %.12g at %g kpc, the density's derivative is %.12g", form, got, r, derivative)
			}
		}
	}
}

// A modified β model without its extras is √1.2 times a β model, and half of it
// twice is a double β model.
func TestFormsAgree(t *testing.T) {
	for _, r := range []float64{3, 90, 1500} {
		want := Beta.lnElectrons([]float64{0.01, 120, 0.6}, r)
		near(t, "modified", ModifiedBeta.lnElectrons([]float64{0.01, 120, 0.6, 0, 1000, 0, 3, 0, 50, 1}, r), want+math.Log(1.2)/2, 1e-14)
		near(t, "double", DoubleBeta.lnElectrons([]float64{0.004, 120, 0.6, 0.006, 120, 0.6}, r), want, 1e-14)
	}
}
