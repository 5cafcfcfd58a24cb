package xray

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat"

	"steelyard/probes/mock"
)

// shellsOf are shells of the gas with the fractional error, noise from rng.
func shellsOf(electrons func(float64) float64, edges []float64, fraction float64, rng *rand.Rand) *Bins {
	m := truth.Atmosphere(mock.Gas{Electrons: electrons})
	b := new(Bins)
	for i := range len(edges) - 1 {
		n := m.Shell(edges[i], edges[i+1])
		b.Inner, b.Outer = append(b.Inner, edges[i]), append(b.Outer, edges[i+1])
		b.Minus, b.Plus = append(b.Minus, fraction*n), append(b.Plus, fraction*n)
		if rng != nil {
			n *= 1 + fraction*rng.NormFloat64()
		}
		b.Value = append(b.Value, n)
	}
	return b
}

// Shells without noise give back the density they were made from.
func TestShellsRecovered(t *testing.T) {
	edges := edgesBetween(10, 1700, 60, true)
	for name, c := range map[string]struct {
		gas  mock.VikhlininGas
		form Form
		want string
	}{
		"plain": {mock.VikhlininGas{N0: 0.008, Rc: 120, Beta: 0.6, Alpha: 0.9, Rs: 1100, Epsilon: 1.5}, "", "a modified β model (Vikhlinin et al. 2006)"},
		"cool":  {coolCore, "", "two components"},
		"beta":  {mock.VikhlininGas{N0: 0.008, Rc: 120, Beta: 0.6, Rs: 1, Rc2: 1}, Beta, "a β model"},
	} {
		g, err := ofShells(shellsOf(c.gas.Electrons, edges, 0.002, nil)).fit(c.form)
		if err != nil {
			t.Fatal(name, err)
		}
		if !strings.Contains(g.Words, c.want) {
			t.Errorf("%s: fitted by %s, want %s", name, g.Words, c.want)
		}
		for _, r := range []float64{20, 100, 500, 1500} {
			// The wide priors of the parameters pull at the level of their own
			// information, a tenth of the error of 0.2%.
			near(t, fmt.Sprintf("%s: n_e at %g kpc", name, r), math.Exp(g.LnElectrons(r)), c.gas.Electrons(r), 4e-4)
		}
		if g.Chi2 > 1 {
			t.Errorf("%s: χ² = %.2f without noise", name, g.Chi2)
		}
	}
}

// With noise χ² is what its degrees of freedom say, and the density lies within
// its errors.
func TestShellsWithNoise(t *testing.T) {
	edges := edgesBetween(10, 1700, 60, true)
	plain := mock.VikhlininGas{N0: 0.008, Rc: 120, Beta: 0.6, Alpha: 0.9, Rs: 1100, Epsilon: 1.5}
	rng := rand.New(rand.NewPCG(11, 12))
	var chi2, pull []float64
	for range 40 {
		g, err := ofShells(shellsOf(plain.Electrons, edges, 0.03, rng)).fit(ModifiedBeta)
		if err != nil {
			t.Fatal(err)
		}
		chi2 = append(chi2, g.Chi2)
		for _, r := range []float64{30, 300, 1200} {
			pull = append(pull, (g.LnElectrons(r)-math.Log(plain.Electrons(r)))/g.deviation(r))
		}
	}
	// 54 ± √108/√40, and 120 pulls of unit normals, of which three a fit are
	// correlated: the standard deviation is good to a tenth.
	if m := stat.Mean(chi2, nil); math.Abs(m-54) > 5 {
		t.Errorf("mean χ² = %.1f for 54 degrees of freedom", m)
	}
	if sd := stat.StdDev(pull, nil); math.Abs(sd-1) > 0.25 {
		t.Errorf("pulls have a standard deviation of %.2f", sd)
	}
}

// deviation is the standard deviation of ln n_e at r kpc.
func (g *Gas) deviation(r float64) float64 {
	var v float64
	for k := range g.Moves {
		v += g.Mode(k, r) * g.Mode(k, r)
	}
	return math.Sqrt(v)
}

// The errors of the density to first order agree with a long chain in the
// parameters, which knows nothing of derivatives (Metropolis et al. 1953).
func TestDensityErrors(t *testing.T) {
	plain := mock.VikhlininGas{N0: 0.008, Rc: 120, Beta: 0.6, Alpha: 0.9, Rs: 1100, Epsilon: 1.5}
	shells := shellsOf(plain.Electrons, edgesBetween(10, 1700, 40, true), 0.05, rand.New(rand.NewPCG(3, 4)))
	f := newFamily(ModifiedBeta, shells)
	g, best, err := ofShells(shells).fitFamily(f)
	if err != nil {
		t.Fatal(err)
	}
	s := &formFit{f, shells, shellMeans(f.form, shells)}
	j := jacobian(s.residuals, best, s.size())
	var normal, covariance mat.SymDense
	normal.SymOuterK(1, j.T())
	var chol mat.Cholesky
	if !chol.Factorize(&normal) || chol.InverseTo(&covariance) != nil || !chol.Factorize(&covariance) {
		t.Fatal("no covariance")
	}
	var lower mat.TriDense
	chol.LTo(&lower)
	rng := rand.New(rand.NewPCG(5, 6))
	radii := []float64{30, 100, 300, 1000, 1600}
	at := make([][]float64, len(radii))
	x, out := append([]float64(nil), best...), make([]float64, s.size())
	s.residuals(x, out)
	now := floats.Dot(out, out) / 2
	trial := make([]float64, len(x))
	const steps = 60000
	for i := range steps {
		copy(trial, x)
		for c := range x {
			u := rng.NormFloat64()
			for r := c; r < len(x); r++ {
				trial[r] += 0.7 * lower.At(r, c) * u
			}
		}
		s.residuals(trial, out)
		if next := floats.Dot(out, out) / 2; math.Log(rng.Float64()) < now-next {
			copy(x, trial)
			now = next
		}
		if i > steps/10 && i%10 == 0 {
			p := f.parameters(x)
			for k, r := range radii {
				at[k] = append(at[k], ModifiedBeta.lnElectrons(p, r))
			}
		}
	}
	for k, r := range radii {
		mean, sd := stat.MeanStdDev(at[k], nil)
		// The chain has some hundred independent points, which gives its standard
		// deviation to 5%; the rest is the curve along which the parameters trade
		// off, which first order straightens.
		if ratio := g.deviation(r) / sd; math.Abs(ratio-1) > 0.15 || math.Abs(mean-g.LnElectrons(r)) > 0.3*sd {
			t.Errorf("%g kpc: sd of ln n_e %.4f, chain %.4f; mean off by %.2f sd", r, g.deviation(r), sd, (mean-g.LnElectrons(r))/sd)
		}
	}
}
