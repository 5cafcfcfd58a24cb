package reported

import (
	"fmt"
	"math"

	"steelyard/probes/halo"
)

// rule is how a mass made one way moves with the cosmology.
type rule struct {
	name      string
	projected bool // made from projected mass, so that `elongation` enters
	// factor is what the mass inside a fixed angle is multiplied by.
	factor func(p *published) float64
	says   string
}

// All but one of the rules keep the angle. With D_A the angular-diameter
// distance of the object and D_ls, D_s those of the source from it and from us:
//
//	hydrostatic, jeans, virial, caustic   M ∝ kT r or σ² r                 ∝ D_A
//	shear, strong-lensing                 M ∝ Σ_cr D_A² ∝ D_A D_s/D_ls
//	gas-mass                              M ∝ M_gas ∝ n_e r³, n_e² r ∝ flux ∝ D_A^(5/2)
//
// A mass by a σ–M relation rests on no distance but on h(z) M at fixed σ, hence
// M ∝ 1/H(z).
var rules = []rule{
	{"hydrostatic", false, byDistance, "∝ D_A"},
	{"jeans", false, byDistance, "∝ D_A"},
	{"virial", false, byDistance, "∝ D_A"},
	{"caustic", false, byDistance, "∝ D_A"},
	{"shear", true, byLens, "∝ D_A D_s/D_ls"},
	{"strong-lensing", true, byLens, "∝ D_A D_s/D_ls"},
	{"gas-mass", false, func(p *published) float64 { return math.Pow(p.stretch, 2.5) }, "∝ D_A^(5/2)"},
	{"dispersion-scaling", false, nil, "M_200c ∝ 1/H(z) at fixed dispersion"},
}

// viaOf is how a mass of each probe is taken to have been made when the recipe
// is silent.
var viaOf = map[string]string{"xray": "hydrostatic", "lensing": "shear", "dynamics": "virial", "sz": "gas-mass"}

func byDistance(p *published) float64 { return p.stretch }

func byLens(p *published) float64 {
	z := p.task.Object.Redshift
	return p.stretch * p.there.Cosmology.Efficiency(z, p.sourceRedshift) / p.task.Cosmology.Efficiency(z, p.sourceRedshift)
}

func findRule(name string) (rule, bool) {
	for _, r := range rules {
		if r.name == name {
			return r, true
		}
	}
	return rule{}, false
}

// move returns the halo that the same observations give in the task's cosmology.
// At fixed angle M₁(r) = k M₀(r D₀/D₁), which is an NFW halo again.
func (v rule) move(h halo.NFW, p *published) (halo.NFW, error) {
	if v.factor == nil {
		return v.atFixedDispersion(h, p)
	}
	s := p.stretch
	return halo.NFW{RhoS: h.RhoS * v.factor(p) / (s * s * s), Rs: h.Rs * s}, nil
}

// atFixedDispersion scales M_200c with 1/H(z) and keeps c_200c.
func (v rule) atFixedDispersion(h halo.NFW, p *published) (halo.NFW, error) {
	z := p.task.Object.Redshift
	there := 200 * p.there.Cosmology.CriticalDensity(z)
	r200, err := halo.RadiusAt(h, there)
	if err != nil {
		return h, p.task.Errorf("%w", err)
	}
	m200 := h.Mass(r200) * p.there.Cosmology.H(z) / p.task.Cosmology.H(z)
	return halo.NewNFW(m200, r200/h.Rs, p.threshold200), nil
}

// line says in words how the mass was carried.
func (v rule) line(p *published) string {
	if p.there.Cosmology == p.task.Cosmology {
		return "taken as quoted in the recipe's cosmology; made via " + v.name
	}
	from := p.there.Cosmology.Params()
	how := fmt.Sprintf("carried from H0 = %g km/s/Mpc, Ω_m = %g; made via %s: %s", from.HubbleConstant, from.OmegaMatter, v.name, v.says)
	if v.factor != nil {
		how += fmt.Sprintf(" at fixed angle, mass multiplied by %.4f, radius by %.4f", v.factor(p), p.stretch)
	}
	if v.projected {
		how += fmt.Sprintf(", sources at redshift %g%s", p.sourceRedshift, p.assumed)
	}
	return how
}
