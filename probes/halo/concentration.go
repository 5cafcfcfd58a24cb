package halo

import (
	"math"
	"slices"

	"steelyard/probes/cosmology"
)

// Relation is a published concentration–mass relation, for M_200c and c_200c.
type Relation struct {
	Name    string // "duffy-2008"
	Source  string
	Scatter float64 // standard deviation of ln c
	// Low and High bound the masses, in Msun, and MaxRedshift the redshift, for
	// which it was calibrated. Limits published in Msun/h are turned to Msun
	// with the Hubble constant of the paper's simulations.
	Low, High, MaxRedshift float64

	median func(m200, z float64, c *cosmology.Cosmology) float64
}

var relations = []Relation{duffy2008, duttonMaccio2014, bhattacharya2013}

// Relations lists the relations known.
func Relations() []Relation { return slices.Clone(relations) }

// FindRelation returns the named relation.
func FindRelation(name string) (Relation, bool) {
	for _, r := range relations {
		if r.Name == name {
			return r, true
		}
	}
	return Relation{}, false
}

// Concentration returns the median c_200c of a halo of mass m200 in Msun.
func (r Relation) Concentration(m200, z float64, c *cosmology.Cosmology) float64 {
	return r.median(m200, z, c)
}

// Extrapolated says that the mass in Msun or the redshift lies outside what the
// relation was calibrated for.
func (r Relation) Extrapolated(m200, z float64) bool {
	return !(m200 >= r.Low && m200 <= r.High && z >= 0 && z <= r.MaxRedshift)
}

// little is the Hubble constant in units of 100 km/s/Mpc.
func little(c *cosmology.Cosmology) float64 { return c.Params().HubbleConstant / 100 }

// dex is a standard deviation of log10 as one of ln.
func dex(s float64) float64 { return s * math.Ln10 }

// duffy2008 is
//
//	c = 5.71 (M/2e12 h⁻¹ Msun)^−0.084 (1+z)^−0.47
//
// of all haloes, NFW, 200 times critical (Duffy et al. 2008, table 1), with
// a scatter of 0.15 in log10 c. Coefficients, scatter and limits from memory.
var duffy2008 = Relation{
	Name:    "duffy-2008",
	Source:  "Duffy et al. 2008, MNRAS 390, L64, table 1 (full sample)",
	Scatter: dex(0.15),
	Low:     1e11 / 0.719, High: 1e15 / 0.719, MaxRedshift: 2,
	median: func(m200, z float64, c *cosmology.Cosmology) float64 {
		return 5.71 * math.Exp(-0.084*math.Log(m200*little(c)/2e12)-0.47*math.Log1p(z))
	},
}

// duttonMaccio2014 is
//
//	log10 c = a + b log10(M/1e12 h⁻¹ Msun)
//	a = 0.520 + 0.385 exp(−0.617 z^1.21),   b = −0.101 + 0.026 z
//
// (Dutton & Macciò 2014, NFW, 200 times critical), with a
// scatter of 0.11 in log10 c. Coefficients, scatter and limits from memory.
var duttonMaccio2014 = Relation{
	Name:    "dutton-maccio-2014",
	Source:  "Dutton & Macciò 2014, MNRAS 441, 3359 (NFW, 200c)",
	Scatter: dex(0.11),
	Low:     1e10 / 0.671, High: 1e15 / 0.671, MaxRedshift: 5,
	median: func(m200, z float64, c *cosmology.Cosmology) float64 {
		a := 0.520 + 0.385*math.Exp(-0.617*math.Pow(z, 1.21))
		b := -0.101 + 0.026*z
		return math.Pow(10, a+b*math.Log10(m200*little(c)/1e12))
	},
}

// bhattacharya2013 is
//
//	c = 5.9 D^0.54 ν^−0.35,   ν = [1.12 (M/5e13 h⁻¹ Msun)^0.3 + 0.53]/D
//
// with D the growth factor, 1 today (Bhattacharya et al. 2013, table 2 for all
// haloes at 200 times critical; their section 2 for ν), with a scatter of a
// third. Coefficients, scatter and limits from memory.
var bhattacharya2013 = Relation{
	Name:    "bhattacharya-2013",
	Source:  "Bhattacharya et al. 2013, ApJ 766, 32, table 2 (full sample)",
	Scatter: 0.33,
	Low:     2e12 / 0.71, High: 2e15 / 0.71, MaxRedshift: 2,
	median: func(m200, z float64, c *cosmology.Cosmology) float64 {
		d := c.GrowthFactor(z)
		nu := (1.12*math.Pow(m200*little(c)/5e13, 0.3) + 0.53) / d
		return 5.9 * math.Pow(d, 0.54) * math.Pow(nu, -0.35)
	},
}
