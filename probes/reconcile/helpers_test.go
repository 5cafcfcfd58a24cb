package reconcile

import (
	"context"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"gonum.org/v1/gonum/mat"

	"steelyard/probes/infer"
)

// model is an estimate whose posterior is known: ln M = level + effect(s) +
// noise, its data adding to the prior N(0,1) of each score s a measurement of
// (weights·s) with the given error (0 for none).
type model struct {
	names   []string
	level   float64
	noise   float64
	effect  func(s []float64) float64
	weights []float64
	value   float64
	err     float64
	like    func(s []float64) float64 // replaces the measurement where set; at most 0
	tilts   []Tilt                    // priors to draw with, one a name; the unit normal when nil
}

func (m model) logLikelihood(s []float64) float64 {
	if m.like != nil {
		return m.like(s)
	}
	if m.err == 0 {
		return 0
	}
	sum := 0.0
	for j, w := range m.weights {
		sum += w * s[j]
	}
	u := (sum - m.value) / m.err
	return -u * u / 2
}

// draws samples the posterior of the estimate alone.
func (m model) draws(rng *rand.Rand, n int) *infer.Draws {
	d := &infer.Draws{N: n, Radii: []float64{500, 1000, 2000}, Covers: [2]float64{500, 2000}, Quality: infer.Quality{Converged: true}}
	next := m.byRejection(rng)
	if len(m.names) == 1 {
		next = m.byTable(rng, n)
	}
	columns := make([][]float64, len(m.names))
	for range n {
		s := next()
		for j, v := range s {
			if m.tilts != nil {
				v = (v - m.tilts[j].Mean) / m.tilts[j].SD
			}
			columns[j] = append(columns[j], v)
		}
		ln := m.level + m.effect(s) + m.noise*rng.NormFloat64()
		d.LnMass = append(d.LnMass, ln-0.5, ln, ln+0.5)
	}
	for j, name := range m.names {
		d.Nuisances = append(d.Nuisances, infer.Parameter{Name: name, Values: columns[j]})
	}
	return d
}

func (m model) byRejection(rng *rand.Rand) func() []float64 {
	return func() []float64 {
		for {
			if s := normals(rng, len(m.names)); rng.Float64() <= math.Exp(m.logLikelihood(s)) {
				return s
			}
		}
	}
}

// byTable inverts the distribution function of one score, tabulated, at n evenly
// spread probabilities in random order: the draws' own noise is not what the
// tests ask about.
func (m model) byTable(rng *rand.Rand, n int) func() []float64 {
	const step = 1e-3
	prior := Tilt{SD: 1}
	if m.tilts != nil {
		prior = m.tilts[0]
	}
	var sum float64
	var below []float64
	for s := -8.0; s < 8; s += step {
		z := (s - prior.Mean) / prior.SD
		sum += math.Exp(m.logLikelihood([]float64{s}) - z*z/2)
		below = append(below, sum)
	}
	order, next := rng.Perm(n), 0
	return func() []float64 {
		u := (float64(order[next]) + rng.Float64()) / float64(n)
		next++
		i, _ := slices.BinarySearch(below, u*sum)
		return []float64{-8 + (float64(i)+rng.Float64()-0.5)*step}
	}
}

// truth is the mean and covariance of both ln M with the nuisances shared, by
// weighting a million joint draws of the prior: brute force.
func truth(models []model, all []string) (mean, sd []float64, correlation float64) {
	rng := rand.New(rand.NewPCG(99, 1))
	var w, wx, wy, wxx, wyy, wxy float64
	for range 1_000_000 {
		s := normals(rng, len(all))
		ln, weight := make([]float64, 2), 0.0
		for k, m := range models {
			own := make([]float64, len(m.names))
			for j, name := range m.names {
				for i, a := range all {
					if a == name {
						own[j] = s[i]
					}
				}
			}
			weight += m.logLikelihood(own)
			ln[k] = m.level + m.effect(own)
		}
		p := math.Exp(weight)
		w, wx, wy = w+p, wx+p*ln[0], wy+p*ln[1]
		wxx, wyy, wxy = wxx+p*ln[0]*ln[0], wyy+p*ln[1]*ln[1], wxy+p*ln[0]*ln[1]
	}
	mx, my := wx/w, wy/w
	vx, vy := wxx/w-mx*mx+models[0].noise*models[0].noise, wyy/w-my*my+models[1].noise*models[1].noise
	return []float64{mx, my}, []float64{math.Sqrt(vx), math.Sqrt(vy)}, (wxy/w - mx*my) / math.Sqrt(vx*vy)
}

func linear(a ...float64) func([]float64) float64 {
	return func(s []float64) float64 {
		sum := 0.0
		for j, c := range a {
			sum += c * s[j]
		}
		return sum
	}
}

// gaussianDraws draws n joint values of ln M with the given means and covariance.
func gaussianDraws(rng *rand.Rand, n int, mean []float64, cov *mat.SymDense) [][]float64 {
	var chol mat.Cholesky
	if !chol.Factorize(cov) {
		panic("covariance")
	}
	root := mat.NewTriDense(len(mean), mat.Lower, nil)
	chol.LTo(root)
	out := make([][]float64, len(mean))
	for k := range out {
		out[k] = make([]float64, n)
	}
	for i := range n {
		z := mat.NewVecDense(len(mean), normals(rng, len(mean)))
		var x mat.VecDense
		x.MulVec(root, z)
		for k := range mean {
			out[k][i] = mean[k] + x.AtVec(k)
		}
	}
	return out
}

func independentDraws(rng *rand.Rand, n int, mean, sd []float64) [][]float64 {
	cov := mat.NewSymDense(len(mean), nil)
	for k := range mean {
		cov.SetSym(k, k, sd[k]*sd[k])
	}
	return gaussianDraws(rng, n, mean, cov)
}

func placeOf(ln [][]float64) *Matched {
	m := &Matched{At: At{Radius: 1000}, LnMass: ln, Common: make([][]float64, len(ln))}
	for range ln {
		m.Marks = append(m.Marks, Mark{Name: "an estimate"})
	}
	return m
}

func pairSigma(t *testing.T, m *Matched) (float64, bool) {
	t.Helper()
	p, err := difference(m, 0, 1)
	if err != nil {
		t.Fatal(err)
	}
	prob, fitted := p.density.LessLikely(0)
	return Sigma(prob), fitted
}

// matchingOf takes the estimates of one place for independent evidence.
func matchingOf(place *Matched) *Matching {
	m := &Matching{Places: []Matched{*place}}
	for k := range place.LnMass {
		name := string(rune('a' + k))
		m.Compared = append(m.Compared, Compared{Name: name, Block: name})
		m.Members = append(m.Members, k)
	}
	return m
}

// matchEstimates joins and matches.
func matchEstimates(t testing.TB, s Setup) *Matching {
	t.Helper()
	joint, err := Share(context.Background(), s.Estimates, infer.NewStream("test"))
	if err != nil {
		t.Fatal(err)
	}
	m, err := MatchAll(s, joint, infer.NewStream("test"))
	if err != nil {
		t.Fatal(err)
	}
	return m
}
