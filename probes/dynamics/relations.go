package dynamics

import (
	"fmt"
	"math"
	"strings"
)

// relation is a published relation between a one-dimensional velocity
// dispersion inside r_200 and M_200c,
//
//	σ = A (h/h₀)^γ (M_200c/1e15 Msun)^α,  h = H(z)/(100 km/s/Mpc).
//
// For most h₀ = 1 and γ = α, that is σ = A [h(z) M_200c/1e15 Msun]^α.
type relation struct {
	name      string // as `relation` spells it
	tracer    string // whose dispersion it is
	amplitude float64
	alpha     float64
	gamma     float64
	pivot     float64 // h₀
	lowest    float64 // mass in Msun down to which it was calibrated; from memory
	source    string
}

// mass is M_200c in Msun at a dispersion in km/s.
func (r relation) mass(sigma, h float64) float64 {
	return 1e15 * math.Pow(sigma/(r.amplitude*math.Pow(h/r.pivot, r.gamma)), 1/r.alpha)
}

var evrard2008 = relation{"evrard-2008", "dark-matter", 1082.9, 0.3361, 0.3361, 1, 1.4e14, "Evrard et al. 2008, ApJ 672, 122"}

// relations lists those known; the first of a name is the one it means when the
// recipe names no tracer. The rows of Munari et al. for dark matter and
// subhaloes and the coefficients of Saro et al. are from memory.
var relations = []relation{
	evrard2008,
	{"munari-2013", "galaxies", 1177, 0.364, 0.364, 1, 1.4e13, "Munari et al. 2013, MNRAS 430, 2638, galaxies (with feedback from active nuclei)"},
	{"munari-2013", "subhaloes", 1199, 0.365, 0.365, 1, 1.4e13, "Munari et al. 2013, MNRAS 430, 2638, subhaloes (with feedback from active nuclei)"},
	{"munari-2013", "dark-matter", 1090, 0.333, 0.333, 1, 1.4e13, "Munari et al. 2013, MNRAS 430, 2638, dark matter"},
	{"saro-2013", "galaxies", 939, 1 / 2.91, 0.33, 0.7, 1.4e14, "Saro et al. 2013, ApJ 772, 47"},
}

// findRelation returns the relation of a name for a tracer, "" for its own.
func findRelation(name, tracer string) (relation, error) {
	var known []string
	for _, r := range relations {
		if r.name != name {
			continue
		}
		if tracer == "" || tracer == r.tracer {
			return r, nil
		}
		known = append(known, fmt.Sprintf("%q", r.tracer))
	}
	return relation{}, fmt.Errorf("the relation %s was not published for tracer = %q; it is for %s", name, tracer, strings.Join(known, ", "))
}

// sphereScatter is the scatter of ln σ of haloes at fixed mass when σ is
// averaged over directions: 4.26% (Evrard et al. 2008; figure from memory).
const sphereScatter = 0.0426

// sightlineScatter is the scatter of ln M at fixed line-of-sight dispersion,
// most of it from the orientation of triaxial haloes: 0.30 + 0.075 z (Saro et
// al. 2013; figures from memory).
func sightlineScatter(z float64) float64 { return 0.30 + 0.075*z }

// The line-of-sight variance of an ellipsoid longer by q along the line of sight
// than across it, at fixed mass and mean square radius, is by the tensor virial
// theorem
//
//	σ_los² / σ² = q^{8/15},
//
// from W_zz/W_xx = q^{4/5} near the sphere (Chandrasekhar 1969, section 21;
// Binney & Tremaine 2008, section 4.8.3) and σ² the mean of the three
// directions. A projected density falling as 1/R, as it does about r_s, is
// raised by elongation = q^{1/3}. Hence
//
//	σ_los² ∝ elongation^{8/5},  R_PV ∝ elongation^{−1}.
const (
	varianceElongation = 8. / 5
	radiusElongation   = -1.
)
