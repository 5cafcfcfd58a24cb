package dynamics

import (
	"math"
	"math/rand/v2"
	"os"
	"testing"

	"steelyard/probes/estimate"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/mock"
)

// TestMeasuredBias prints the bias and the coverage that the methods state of
// themselves. It asserts nothing about them: at one fixed halo they are to be
// reported.
func TestMeasuredBias(t *testing.T) {
	if os.Getenv("STEELYARD_SLOW") == "" {
		t.Skip("weighs some thousand catalogues; set STEELYARD_SLOW=1 to run it")
	}
	const mocks = 60
	set := method.Settings{"relation": method.Word("evrard-2008"), "concentration": method.Exactly(4), "intrinsic_scatter": method.Exactly(0)}
	// The halo need not lie on the relation; what it is off is no fault of the
	// estimator.
	h := math.Sqrt(invented.OmegaMatter*math.Pow(1+invented.Redshift, 3)+1-invented.OmegaMatter) * invented.HubbleConstant / 100
	t.Logf("the halo's own dispersion stands for ln M %+.3f by evrard-2008", math.Log(evrard2008.mass(sphereDispersion(invented), h)/invented.M200))
	for _, m := range []estimate.Method{dispersionScaling, virial, projectedMass, jeans, caustic} {
		t.Run(m.Name, func(t *testing.T) {
			for _, members := range []string{"given", "sigma-clip", "shifting-gapper"} {
				for _, n := range []int{50, 200} {
					for _, radii := range []float64{1, 2} {
						mean, sd, inside := measure(t, m, members, n, radii, mocks, set)
						t.Logf("members %s, %d galaxies inside %g r_200: bias of ln M %+.3f ± %.3f, scatter %.3f, 68%% interval holds the truth in %.0f%%",
							members, n, radii, mean, sd/math.Sqrt(mocks), sd, 100*inside)
					}
				}
			}
		})
	}
}

// measure weighs mocks of the invented halo, leaving out those that cannot be weighed; with members to be found, a quarter
// as many field galaxies over ±6000 km/s and a tenth as many infalling ones are
// mixed in.
func measure(t *testing.T, m estimate.Method, members string, n int, radii float64, mocks int, set method.Settings) (mean, sd, inside float64) {
	t.Helper()
	var off []float64
	for k := range uint64(mocks) {
		field := mock.Motions{Members: n, Radius: within(invented, radii), RedshiftError: 1e-4, Reach: 10}
		if members != "given" {
			field.Field, field.Infalling = n/4, n/10
		}
		task := weighing(t, invented, tableOf(invented.Motions(field, rand.New(rand.NewPCG(k, uint64(n))))), members)
		task.Sampling.Draws = 500
		if _, err := reduced(t, task); err != nil {
			t.Fatal(err)
		}
		own := method.Settings{}
		for _, s := range m.Settings {
			if v, ok := set[s.Name]; ok {
				own[s.Name] = v
			}
		}
		d, err := weigh(t, task, m, own)
		if err != nil {
			t.Logf("mock %d: %v", k, err)
			continue
		}
		p := infer.Percentiles(d.Parameter("mass_200c").Values, 16, 50, 84)
		off = append(off, math.Log(p[1]/invented.M200))
		if p[0] < invented.M200 && p[2] > invented.M200 {
			inside++
		}
	}
	mean, sd = meanAndSpread(off, nil)
	return mean, sd, inside / float64(len(off))
}
