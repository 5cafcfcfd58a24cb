package dynamics

import (
	"fmt"
	"math"
)

// clipConcentration is r_200/r_s of the halo whose σ(R) the clipping follows; 4
// is typical of clusters (Mamon, Biviano & Boué 2013, section 3).
const clipConcentration = 4

// sigmaClip keeps the galaxies within so many times the local dispersion (see
// clipped) and gives the reasons.
func (f *field) sigmaClip(group []candidate) ([]string, error) {
	clip := f.number("clip")
	err := f.clipped(group, clip)
	reasons := make([]string, len(group))
	for k, c := range group {
		side := "within"
		if !c.member {
			side = "beyond"
		}
		reasons[k] = fmt.Sprintf("%+.0f km/s at %.0f kpc, %s %.3g times the local %.0f km/s", c.velocity, c.radius, side, clip, c.limit/clip)
	}
	f.note("members: %d galaxies within %.3g times the local dispersion of an isotropic NFW halo (Mamon, Biviano & Murante 2010)", countMembers(group), clip)
	return reasons, err
}

// clipped keeps the galaxies of a group with
//
//	|v| < κ σ(R),
//
// σ(R) being the line-of-sight dispersion of an isotropic NFW halo scaled so
// that its mean over the members is their measured dispersion; its scale radius
// follows from that dispersion by the relation of Evrard et al. 2008. κ = 2.7
// keeps most members at least contamination (Mamon, Biviano & Murante 2010).
// Galaxies may come back in a later round.
func (f *field) clipped(group []candidate, clip float64) error {
	local := make([]float64, len(group))
	return f.settle(group, func() error {
		v := recentre(group)
		sigma := scaleNamed("automatic", len(v)).of(sorted(v), nil)
		rs := coreRadius(f.task, sigma) / clipConcentration
		mean, n := 0.0, 0.0
		for k, c := range group {
			local[k] = losTable().at(math.Log(c.radius / rs))
			if c.member {
				mean += local[k]
				n++
			}
		}
		for k := range group {
			group[k].limit = clip * sigma * math.Sqrt(local[k]*n/mean)
			group[k].member = math.Abs(group[k].velocity) < group[k].limit
		}
		return nil
	})
}

func countMembers(group []candidate) int {
	n := 0
	for _, c := range group {
		if c.member {
			n++
		}
	}
	return n
}
