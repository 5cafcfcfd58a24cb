package xray

import "math"

// Form is a published formula for the electron density of a cluster.
type Form string

// The forms, with r in kpc and densities in cm⁻³.
const (
	// Beta is n_e = n0 (1 + r²/rc²)^(−3β/2) (Cavaliere & Fusco-Femiano 1978).
	Beta Form = "beta"
	// DoubleBeta is the sum of two β models of n_e (as in LaRoque et al. 2006,
	// here with a β of its own for each).
	DoubleBeta Form = "double-beta"
	// ModifiedBeta is eq. 3 of Vikhlinin et al. 2006,
	//
	//	n_p n_e = n0² (r/rc)^(−α) / (1 + r²/rc²)^(3β − α/2) / (1 + r^γ/rs^γ)^(ε/γ)
	//	          + n02² / (1 + r²/rc2²)^(3β2),
	//
	// a formula for n_p n_e, so that n_e = (1.2 n_p n_e)^½ (their n_e/n_p).
	ModifiedBeta Form = "modified-beta"
)

// electronsPerProton is the n_e/n_p with which the published parameters of the
// modified β model are read (Vikhlinin et al. 2006, section 3.1).
const electronsPerProton = 1.2

// parameter is one parameter of a form.
type parameter struct {
	name, unit string
	optional   bool // a published model may leave it out
	value      float64
}

// parameters lists a form's parameters in their order, with what stands for
// one that is left out.
func (f Form) parameters() []parameter {
	switch f {
	case Beta:
		return []parameter{{name: "n0", unit: "cm**-3"}, {name: "rc", unit: "kpc"}, {name: "beta"}}
	case DoubleBeta:
		return []parameter{{name: "n0", unit: "cm**-3"}, {name: "rc", unit: "kpc"}, {name: "beta"},
			{name: "n02", unit: "cm**-3"}, {name: "rc2", unit: "kpc"}, {name: "beta2"}}
	case ModifiedBeta:
		return []parameter{{name: "n0", unit: "cm**-3"}, {name: "rc", unit: "kpc"}, {name: "beta"},
			{name: "alpha", optional: true}, {name: "rs", unit: "kpc", optional: true, value: 1000},
			{name: "epsilon", optional: true}, {name: "gamma", optional: true, value: 3},
			{name: "n02", unit: "cm**-3", optional: true}, {name: "rc2", unit: "kpc", optional: true, value: 50},
			{name: "beta2", optional: true, value: 1}}
	}
	return nil
}

func (f Form) has(name string) bool {
	for _, p := range f.parameters() {
		if p.name == name {
			return true
		}
	}
	return false
}

// lnElectrons returns ln n_e in cm⁻³ at r kpc, p in the order of parameters.
func (f Form) lnElectrons(p []float64, r float64) float64 {
	switch f {
	case Beta:
		return lnBeta(p[0], p[1], p[2], r)
	case DoubleBeta:
		return logAdd(lnBeta(p[0], p[1], p[2], r), lnBeta(p[3], p[4], p[5], r))
	case ModifiedBeta:
		n0, rc, beta, alpha, rs, epsilon, gamma := p[0], p[1], p[2], p[3], p[4], p[5], p[6]
		ln := 2*math.Log(n0) - (3*beta-alpha/2)*math.Log(1+r*r/(rc*rc))
		if alpha != 0 {
			ln -= alpha * math.Log(r/rc)
		}
		if epsilon != 0 {
			ln -= epsilon / gamma * math.Log(1+power(r/rs, gamma))
		}
		if p[7] > 0 {
			ln = logAdd(ln, 2*lnBeta(p[7], p[8], p[9], r))
		}
		return (ln + lnElectronsPerProton) / 2
	}
	panic("xray: no such density form: " + string(f))
}

var lnElectronsPerProton = math.Log(electronsPerProton)

// slope returns d ln n_e / d ln r at r kpc.
func (f Form) slope(p []float64, r float64) float64 {
	switch f {
	case Beta:
		return slopeBeta(p[1], p[2], r)
	case DoubleBeta:
		a, b := lnBeta(p[0], p[1], p[2], r), lnBeta(p[3], p[4], p[5], r)
		share := 1 / (1 + math.Exp(b-a))
		return share*slopeBeta(p[1], p[2], r) + (1-share)*slopeBeta(p[4], p[5], r)
	case ModifiedBeta:
		alpha, epsilon := p[3], p[5]
		x, v := r*r/(p[1]*p[1]), power(r/p[4], p[6])
		s := -alpha - 2*(3*p[2]-alpha/2)*x/(1+x) - epsilon*v/(1+v)
		if p[7] > 0 {
			first := append([]float64(nil), p...)
			first[7] = 0
			a := 2*f.lnElectrons(first, r) - lnElectronsPerProton
			share := 1 / (1 + math.Exp(2*lnBeta(p[7], p[8], p[9], r)-a))
			s = share*s + (1-share)*2*slopeBeta(p[8], p[9], r)
		}
		return s / 2
	}
	panic("xray: no such density form: " + string(f))
}

func lnBeta(n0, rc, beta, r float64) float64 {
	return math.Log(n0) - 1.5*beta*math.Log(1+r*r/(rc*rc))
}

func slopeBeta(rc, beta, r float64) float64 { return -3 * beta * r * r / (rc*rc + r*r) }

// power is x^γ, quick for the published γ = 3.
func power(x, gamma float64) float64 {
	if gamma == 3 {
		return x * x * x
	}
	return math.Pow(x, gamma)
}

// logAdd returns ln(eᵃ + eᵇ).
func logAdd(a, b float64) float64 {
	if a < b {
		a, b = b, a
	}
	return a + math.Log(1+math.Exp(b-a))
}
