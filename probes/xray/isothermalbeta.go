package xray

import "steelyard/probes/constants"

// isothermalBeta is the mass in Msun inside r kpc that holds gas of one
// temperature kT (keV) and of a β model with core radius rc (kpc),
//
//	M(<r) = 3 β kT r³ / (G μ m_p (r² + rc²))
//
// (Cavaliere & Fusco-Femiano 1978), μ being the mean molecular weight.
func isothermalBeta(kT, beta, rc, mu, r float64) float64 {
	return 3 * beta * kT * constants.HydrostaticMass / mu * r * r * r / (r*r + rc*rc)
}
