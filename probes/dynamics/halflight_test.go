package dynamics

import (
	"math"
	"strings"
	"testing"

	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// The mass of σ = 500 km/s and R_e = 400 kpc, computed with mpmath at 30 digits
// from Wolf et al. 2010; their rounded form 930 σ² R_e/pc gives 9.3e13.
func TestHalfLightMass(t *testing.T) {
	near(t, "half-light mass", HalfLightMass(500, 400), 93003416454143.03, 1e-12)
	near(t, "half-light mass", HalfLightMass(500, 400), 930*500*500*400e3, 1e-3)
	// A Plummer sphere of 1e14 Msun and a = 100 kpc has σ_los = 649.80 km/s over
	// all stars, R_e = 100 kpc and half its mass inside 1.30477 a: the estimate is
	// 0.7854 of the truth inside that radius (mpmath at 30 digits).
	near(t, "over the truth of a Plummer sphere", HalfLightMass(649.8011738996457, 100)/5e13, 0.7853981633974483, 1e-10)
}

func TestHalfLightOfAGalaxy(t *testing.T) {
	sigma, err := prior.Normal(220, 8)
	if err != nil {
		t.Fatal(err)
	}
	task := weighing(t, invented, nil, "given")
	task.Blocks = map[string]method.Settings{"dispersion": {"value": {Set: true, Prior: sigma, Unit: "km/s"}}}
	d, err := weigh(t, task, halfLight, method.Settings{"half_light_radius": {Set: true, Prior: prior.Prior{Kind: prior.NormalKind, A: 6, B: 0.5}, Unit: "kpc"}})
	if err != nil {
		t.Fatal(err)
	}
	s, re := d.Parameter("dispersion").Values, d.Parameter("half_light_radius").Values
	for i := range s {
		// 1e-4 is what interpolation on the grid may cost.
		near(t, "mass inside r_1/2", math.Exp(d.LnMassAt(i, math.Log(4./3*re[i]))), HalfLightMass(s[i], re[i]), 1e-4)
	}
	between(t, "radius covered", d.Covers[0], 7, 8)
	between(t, "radius covered", d.Covers[1], 8, 9)
	if said := strings.Join(d.Assumes, "\n"); !strings.Contains(said, "r_1/2 = (4/3) R_e = 8") {
		t.Errorf("r_1/2 is not said:\n%s", said)
	}
}
