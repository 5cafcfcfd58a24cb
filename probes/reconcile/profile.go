package reconcile

import (
	"gonum.org/v1/gonum/mat"
)

// ProfileTension is the difference of two estimates at several radii at once.
type ProfileTension struct {
	A, B  string
	At    []string
	Kept  int     // independent directions of Δ(r) that were kept
	Sigma float64 // two-sided equivalent of P
	P     float64 // probability of a difference of profiles less likely than none
	Tail  bool    // a fitted tail was used
}

// negligible is the share of the largest eigenvalue below which a direction of
// Δ(r) is dropped: masses at neighbouring radii move together, and a direction
// in which they hardly can holds interpolation rather than data.
const negligible = 0.01

// profileTensions compares the profiles of every pair of independent data at
// all matched radii at once; nil when there are fewer than two.
func profileTensions(m *Matching) []ProfileTension {
	var places []*Matched
	var labels []string
	for i := range m.Places {
		if p := &m.Places[i]; !p.Own {
			places, labels = append(places, p), append(labels, p.At.String())
		}
	}
	if len(places) < 2 {
		return nil
	}
	var out []ProfileTension
	for a, x := range m.Compared {
		for b := a + 1; b < len(m.Compared); b++ {
			if x.Block == m.Compared[b].Block {
				continue
			}
			t := profileTension(places, a, b)
			t.A, t.B, t.At = x.Name, m.Compared[b].Name, labels
			out = append(out, t)
		}
	}
	return out
}

// profileTension takes Δ(r) = ln M_a(<r) − ln M_b(<r) over the joint draws as
// one vector and keeps the eigenvectors of its covariance whose eigenvalue is
// above 1% of the largest, a choice that does not look at Δ itself. One kept
// direction is compared like a pair at one radius; of several, how likely a
// point is goes by its distance from the mean in standard deviations.
func profileTension(places []*Matched, a, b int) ProfileTension {
	n, width := len(places[0].LnMass[a]), len(places)
	rows, flat := make([][]float64, n), make([]float64, n*width)
	for i := range rows {
		rows[i] = flat[i*width : (i+1)*width]
		for j, p := range places {
			rows[i][j] = p.LnMass[a][i] - p.LnMass[b][i]
		}
	}
	mean, cov := moments(rows)
	var eigen mat.EigenSym
	eigen.Factorize(cov, true) // of a symmetric matrix: converges
	values := eigen.Values(nil)
	var vectors mat.Dense
	eigen.VectorsTo(&vectors)
	var t ProfileTension
	var kept []int
	for i, v := range values {
		if v > negligible*values[len(values)-1] {
			kept = append(kept, i)
		}
	}
	t.Kept = len(kept)
	if t.Kept == 1 {
		along := &Matched{LnMass: make([][]float64, 2), Common: make([][]float64, 2)}
		for i, k := range []int{a, b} {
			for j, p := range places {
				along.LnMass[i] = addScaled(along.LnMass[i], vectors.At(j, kept[0]), p.LnMass[k])
				along.Common[i] = addScaled(along.Common[i], vectors.At(j, kept[0]), p.Common[k])
			}
		}
		residual, common := parts(along, []int{0, 1})
		t.P, t.Tail = convolve(residual[0], minus(nil, residual[1]), minus(common[0], common[1])).LessLikely(0)
		t.Sigma = Sigma(t.P)
		return t
	}
	depth := func(x []float64) float64 {
		sum := 0.0
		for _, k := range kept {
			along := 0.0
			for j, v := range x {
				along += vectors.At(j, k) * (v - mean[j])
			}
			sum += along * along / values[k]
		}
		return -sum / 2
	}
	depths := make([]float64, len(rows))
	for i, x := range rows {
		depths[i] = depth(x)
	}
	t.P, t.Tail = shareBelow(depths, depth(make([]float64, len(places))), t.Kept)
	t.Sigma = Sigma(t.P)
	return t
}

// addScaled is sum + f·x, sum made when nil; x nil adds nothing.
func addScaled(sum []float64, f float64, x []float64) []float64 {
	if x == nil {
		return sum
	}
	if sum == nil {
		sum = make([]float64, len(x))
	}
	for i, v := range x {
		sum[i] += f * v
	}
	return sum
}
