package xray

import (
	"math"

	"steelyard/probes/estimate"
	"steelyard/probes/halo"
	"steelyard/probes/method"
)

var nonthermalSettings = []method.Setting{
	{
		Name: "nonthermal_fraction", Kind: method.Number, Low: 0, High: 0.95, Default: method.Exactly(0),
		Doc: "constant share f = P_nt/(P_th + P_nt) of the pressure that is not thermal: M = M_th/(1 − f)",
	},
	{
		Name: "nonthermal_profile", Kind: method.Choice, Choices: []string{"constant", "nelson-2014"}, Default: method.Word("constant"),
		Doc: "`constant` for nonthermal_fraction at all radii; `nelson-2014` for f(r) = nonthermal_scale · (1 − 0.452 (1 + exp(−(r/0.841 r_200m)^1.628))), " +
			"the mean of simulated clusters, r_200m being that of the mass itself",
		Source: "Nelson, Lau & Nagai 2014, ApJ 792, 25, eq. 7 (figures from memory)",
	},
	{
		Name: "nonthermal_scale", Kind: method.Number, Low: 0, High: 2, Default: method.Exactly(1),
		Doc: "multiplies the share of nelson-2014; unused with `constant`",
	},
}

// support says how much of the pressure is thermal.
type support struct {
	radial    bool
	fraction  estimate.Ref
	scale     estimate.Ref
	threshold float64 // 200 times the mean matter density, Msun/kpc³
}

func (f *fit) newSupport() (support, error) {
	t := f.task
	s := support{radial: t.Settings["nonthermal_profile"].Text == "nelson-2014"}
	if !s.radial {
		s.fraction = f.parameters.Assume(t.Settings, "nonthermal_fraction")
		return s, nil
	}
	if v := t.Settings["nonthermal_fraction"]; !v.Prior.IsExact() || v.Prior.A != 0 {
		return s, t.Errorf("nonthermal_fraction is the constant share; with nonthermal_profile = \"nelson-2014\" set nonthermal_scale instead")
	}
	s.fraction = estimate.Fixed(0)
	s.scale = f.parameters.Assume(t.Settings, "nonthermal_scale")
	var err error
	if s.threshold, err = (halo.Definition{Delta: 200, Of: "mean"}).Threshold(t.Cosmology, t.Object.Redshift); err != nil {
		return s, t.Errorf("%w", err)
	}
	return s, nil
}

// nelson is the share of the pressure that is not thermal at x = r/r_200m, and
// its derivative by ln x (Nelson, Lau & Nagai 2014).
func nelson(x float64) (share, slope float64) {
	const a, b, gamma = 0.452, 0.841, 1.628
	y := math.Pow(x/b, gamma)
	e := math.Exp(-y)
	return 1 - a*(1+e), a * gamma * y * e
}

// thermal returns the thermal share of the pressure at theta, x = r/r_200m, and
// d ln(share)/d ln r.
func (s support) thermal(theta []float64, x float64) (share, slope float64) {
	if !s.radial {
		return 1 - s.fraction.Of(theta), 0
	}
	f, df := nelson(x)
	k := s.scale.Of(theta)
	share = 1 - k*f
	return share, -k * df / share
}

// fill sets out to the thermal share at the radii for the mass h; false where
// there is none, or h has no r_200m.
func (s support) fill(out, theta []float64, h halo.Model, radii []float64) bool {
	r200m := 1.0
	if s.radial {
		var err error
		if r200m, err = halo.RadiusAt(h, s.threshold); err != nil {
			return false
		}
	}
	share := 1 - s.fraction.Of(theta)
	for j, r := range radii {
		if s.radial {
			share, _ = s.thermal(theta, r/r200m)
		}
		if out[j] = share; !(share > 0) {
			return false
		}
	}
	return true
}

// setting names what the share rests on.
func (s support) setting() string {
	if s.radial {
		return "nonthermal_scale"
	}
	return "nonthermal_fraction"
}
