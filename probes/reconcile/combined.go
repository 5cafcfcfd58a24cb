package reconcile

import (
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"

	"steelyard/probes/infer"
)

// Combined is the mass that all independent estimates give at one place.
type Combined struct {
	At      string
	Of      []string
	Linear  Combination  // the best linear one
	Scatter *Combination // with scatter beyond the errors; nil when the errors suffice
}

// Combination is a weighted mean of ln M.
type Combination struct {
	Mass      Interval  // Msun
	Weights   []float64 // of Combined.Of, adding up to one
	ScatterLn float64   // of ln M beyond the errors of the estimates
}

// CombinedProfile is a combined profile read at its own radii.
type CombinedProfile struct {
	Scattered bool // with scatter beyond the errors, where there is any
	Own       []OwnMass
}

// combination turns a weighted mean into a mass: the weighted sum of the joint
// draws, spread by the scatter, which the estimates average out in part.
func combination(l Linear, ln [][]float64, scores []float64) Combination {
	return Combination{Mass: expInterval(weighted(l, ln, scores)), Weights: l.Weights, ScatterLn: l.Scatter}
}

// weighted is Σ w_k ln M_k + τ √(Σ w_k²) z of every joint draw, z a unit normal.
func weighted(l Linear, ln [][]float64, z []float64) []float64 {
	out := make([]float64, len(ln[0]))
	square := 0.0
	for k, w := range l.Weights {
		square += w * w
		for i, v := range ln[k] {
			out[i] += w * v
		}
	}
	if extra := l.Scatter * math.Sqrt(square); extra > 0 {
		for i := range out {
			out[i] += extra * z[i]
		}
	}
	return out
}

// combine combines the members at one place.
func combine(place *Matched, m *Matching, stream infer.Stream) (Combined, error) {
	c := Combined{At: place.At.String()}
	var ln, common [][]float64
	for _, k := range m.Members {
		c.Of = append(c.Of, m.Compared[k].Name)
		ln, common = append(ln, place.LnMass[k]), append(common, place.Common[k])
	}
	mean, cov := jointMoments(ln, common)
	linear, err := BestLinear(mean, cov)
	if err != nil {
		return c, fmt.Errorf("%s: %w", place.At, err)
	}
	c.Linear = combination(linear, ln, nil)
	random, err := RandomEffects(mean, cov)
	if err != nil {
		return c, fmt.Errorf("%s: %w", place.At, err)
	}
	if random.Scatter > 0 {
		scattered := combination(random, ln, scatterScores(stream, len(ln[0])))
		c.Scatter = &scattered
	}
	return c, nil
}

func scatterScores(stream infer.Stream, n int) []float64 {
	return normals(stream.Sub("scatter beyond the errors").Rand(0), n)
}

// jointMoments is the mean and the covariance of joint draws of ln M. What the
// shared nuisances do not carry is independent between estimates, which takes
// the Monte Carlo noise out of their correlation.
func jointMoments(ln, common [][]float64) ([]float64, *mat.SymDense) {
	mean, cov := make([]float64, len(ln)), mat.NewSymDense(len(ln), nil)
	for k, y := range ln {
		var sd float64
		mean[k], sd = meanSD(y)
		if common[k] == nil {
			cov.SetSym(k, k, sd*sd)
			continue
		}
		_, residual := meanSD(minus(y, common[k]))
		for l := range k + 1 {
			if common[l] != nil {
				cov.SetSym(k, l, covarianceOf(common[k], common[l]))
			}
		}
		cov.SetSym(k, k, cov.At(k, k)+residual*residual)
	}
	return mean, cov
}

func covarianceOf(x, y []float64) float64 {
	mx, _ := meanSD(x)
	my, _ := meanSD(y)
	sum := 0.0
	for i := range x {
		sum += (x[i] - mx) * (y[i] - my)
	}
	return sum / float64(len(x))
}

// ownRange is the part of the grid in which the combined profile must be known to
// find its own radii: those of the members' mean profiles, and as much again in
// the logarithm of the radius as their masses may be off.
func (s Setup) ownRange(members []int) ([]float64, error) {
	const room = 1.8 // a factor of 3 in the mass of a profile M ∝ r
	grid := infer.Grid()
	from, to := len(grid)-1, 0
	for _, k := range members {
		mean := meanProfile(s.Estimates[k].Draws)
		for _, def := range s.Own {
			threshold, err := s.Background.threshold(def)
			if err != nil {
				return nil, err
			}
			r, _, _ := ownRadii(mean, threshold)
			lo, _ := slices.BinarySearch(grid, r[0]/room)
			hi, _ := slices.BinarySearch(grid, r[0]*room)
			from, to = min(from, lo), max(to, hi)
		}
	}
	return grid[max(from-1, 0):min(to+1, len(grid))], nil
}

func meanProfile(d *infer.Draws) *infer.Draws {
	width := len(d.Radii)
	mean := &infer.Draws{N: 1, Radii: d.Radii, LnMass: make([]float64, width)}
	for i := range d.N {
		for j, v := range d.LnMass[i*width : (i+1)*width] {
			mean.LnMass[j] += v
		}
	}
	for j := range mean.LnMass {
		mean.LnMass[j] /= float64(d.N)
	}
	return mean
}

// combineProfiles combines the members radius by radius and reads the outcome
// at its own radii.
func (s Setup) combineProfiles(m *Matching, carriers []*carrier, stream infer.Stream) error {
	if len(m.Members) < 2 || len(s.Own) == 0 {
		return nil
	}
	covers := [2]float64{0, math.Inf(1)}
	for _, k := range m.Members {
		covers[0], covers[1] = max(covers[0], m.Compared[k].Covers[0]), min(covers[1], m.Compared[k].Covers[1])
	}
	radii, err := s.ownRange(m.Members)
	if err != nil {
		return err
	}
	n := len(carriers[m.Members[0]].order)
	z := scatterScores(stream, n)
	linear := &infer.Draws{N: n, Radii: radii, Covers: covers, LnMass: make([]float64, n*len(radii))}
	random := *linear
	random.LnMass = slices.Clone(linear.LnMass)
	scattered := false
	for j, r := range radii {
		var ln, common [][]float64
		for _, k := range m.Members {
			y, part, err := carriers[k].at(r)
			if err != nil {
				return fmt.Errorf("%s: %w", m.Compared[k].Name, err)
			}
			ln, common = append(ln, y), append(common, part)
		}
		mean, cov := jointMoments(ln, common)
		best, err := BestLinear(mean, cov)
		if err != nil {
			return fmt.Errorf("the combined profile at %.0f kpc: %w", r, err)
		}
		wide, err := RandomEffects(mean, cov)
		if err != nil {
			return fmt.Errorf("the combined profile at %.0f kpc: %w", r, err)
		}
		scattered = scattered || wide.Scatter > 0
		for i, v := range weighted(best, ln, nil) {
			linear.LnMass[i*len(radii)+j] = v
		}
		for i, v := range weighted(wide, ln, z) {
			random.LnMass[i*len(radii)+j] = v
		}
	}
	for _, d := range []*infer.Draws{linear, &random} {
		if d == &random && !scattered {
			break
		}
		own, err := OwnMasses(d, s.Own, s.Background)
		if err != nil {
			return err
		}
		m.Combined = append(m.Combined, CombinedProfile{Scattered: d == &random, Own: own})
	}
	return nil
}
