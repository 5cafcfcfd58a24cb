package xray

import (
	"context"

	"steelyard/probes/constants"
	"steelyard/probes/estimate"
	"steelyard/probes/infer"
	"steelyard/probes/method"
)

var isothermalBetaMethod = estimate.Method{
	Declaration: method.Declaration{
		Name:     "isothermal-beta",
		Version:  1,
		Summary:  "The closed form for gas of one temperature with the density of a β model.",
		Equation: "M(<r) = 3 β kT r³ / (G μ m_p (1 − f) (r² + rc²))",
		Sources:  []string{"Cavaliere & Fusco-Femiano 1978"},
		Data:     gasData,
		Settings: gasAssumptions,
		Cautions: append([]string{
			"the density block must say `model = \"beta\"`, with its parameters or with a file that a β model is fitted to",
			"one temperature is fitted to all bins: where they differ, the fit is poor and says so, and the mass is biased",
		}, gasCautions...),
	},
	Uses: []string{"density", "temperature"},
	Run: func(ctx context.Context, t *estimate.Task) (*infer.Draws, error) {
		f, err := newFit(t)
		if err != nil {
			return nil, err
		}
		if f.gas.Form != Beta {
			return nil, t.Errorf("the method isothermal-beta needs a β model: say `model = \"beta\"` in the density block")
		}
		return f.fromSlopes(ctx, isothermal)
	},
}

// isothermalBeta is the mass in Msun inside r kpc that holds gas of one
// temperature kT (keV) and of a β model with core radius rc (kpc),
//
//	M(<r) = 3 β kT r³ / (G μ m_p (r² + rc²))
//
// (Cavaliere & Fusco-Femiano 1978), μ being the mean molecular weight.
func isothermalBeta(kT, beta, rc, mu, r float64) float64 {
	return 3 * beta * kT * constants.HydrostaticMass / mu * r * r * r / (r*r + rc*rc)
}
