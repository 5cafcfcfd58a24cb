package prior

import (
	"math"
	"testing"
)

// Uniform and log-uniform limits are approached without cancellation.
func TestFromScoreKeepsItsTails(t *testing.T) {
	u, _ := Uniform(0, 1)
	if got, want := u.FromScore(-8), 6.220960574271785e-16; math.Abs(got/want-1) > 1e-13 {
		t.Errorf("uniform at −8: %g, want %g (scipy.stats.norm.cdf)", got, want)
	}
}
