package dynamics

import (
	"fmt"
	"math"
	"math/bits"
	"slices"
	"sort"
)

// shiftingGapper rejects, around each projected radius in turn, the galaxies
// that a gap in velocity separates from the cluster's body (Fadda et al. 1996).
// A bin centred on each galaxy is 0.4 h⁻¹ Mpc wide or wide enough to hold 15
// galaxies; its body grows from the mean velocity outwards until two neighbours
// lie further apart than the gap. Rounds follow until the members stay the same.
func (f *field) shiftingGapper(group []candidate) ([]string, error) {
	gap, says := densityGap, "gap by density (Adami et al. 1998)"
	if v := f.settings["gap"]; v.Set {
		gap, says = func(int) float64 { return v.Prior.A }, fmt.Sprintf("gap %.0f km/s", v.Prior.A)
	}
	fewestInBin, width := int(f.number("bin_count")), f.number("bin_width")
	if !f.settings["bin_width"].Set {
		width = 400 / (f.task.Cosmology.Params().HubbleConstant / 100)
	}
	sort.SliceStable(group, func(a, b int) bool { return group[a].radius < group[b].radius })
	reasons := make([]string, len(group))
	for k := range reasons {
		reasons[k] = "part of the body at its radius"
	}
	var velocities []float64
	err := f.settle(group, func() error {
		velocities = recentre(group)
		for _, k := range gapped(group, gap, width, fewestInBin) {
			group[k].member = false
			reasons[k] = fmt.Sprintf("%+.0f km/s, behind a gap at %.0f kpc", group[k].velocity, group[k].radius)
		}
		return nil
	})
	f.note("members: %d galaxies by the shifting gapper, %s, bins of %.0f kpc or %d galaxies (Fadda et al. 1996)",
		len(velocities), says, width, fewestInBin)
	if err == nil {
		f.crowded(group)
	}
	return reasons, err
}

// densityGap is the gap in km/s that separates systems among n velocities, 500
// (1 + exp(−(n−6)/33)) (Adami et al. 1998; formula from memory), at most 1000.
func densityGap(n int) float64 {
	return math.Min(1000, 500*(1+math.Exp(-float64(n-6)/33)))
}

// crowded warns when clipping would reject many of the members: then the field
// is too dense to leave gaps.
func (f *field) crowded(group []candidate) {
	trial := *f // notes and warnings of the trial are not wanted
	again := append([]candidate(nil), group...)
	again = slices.DeleteFunc(again, func(c candidate) bool { return !c.member })
	before := len(again)
	if err := trial.clipped(again, f.number("clip")); err != nil {
		return // so few members that nothing can be said
	}
	if beyond := before - countMembers(again); beyond > 3 && 20*beyond > before {
		f.warn("%d of the %d members lie beyond %.3g times the local dispersion: the field is so dense that no gap cuts it off; `members { method = \"sigma-clip\" }` does",
			beyond, before, f.number("clip"))
	}
}

// gapped returns the members of a group, sorted by radius, that lie outside the
// velocity body of the bin around them.
func gapped(group []candidate, gap func(n int) float64, width float64, fewestInBin int) []int {
	var members []int // positions in group, by radius
	for k, c := range group {
		if c.member {
			members = append(members, k)
		}
	}
	n := len(members)
	byVelocity := append([]int(nil), members...)
	sort.SliceStable(byVelocity, func(a, b int) bool { return group[byVelocity[a]].velocity < group[byVelocity[b]].velocity })
	rank := make([]int, len(group))
	velocities := make([]float64, n)
	for r, k := range byVelocity {
		rank[k], velocities[r] = r, group[k].velocity
	}
	zero := sort.SearchFloat64s(velocities, 0) // rank of the first velocity not below the mean

	// The bin is the stretch [from, to) of members; its velocity ranks are the
	// bits that are set, so the body is walked without sorting each bin.
	set := make(bitset, n/64+1)
	from, to := 0, 0
	var out []int
	for i, k := range members {
		lo, hi := bin(group, members, i, width, fewestInBin)
		for ; to < hi; to++ {
			set.add(rank[members[to]])
		}
		for ; from < lo; from++ {
			set.remove(rank[members[from]])
		}
		for ; from > lo; from-- {
			set.add(rank[members[from-1]])
		}
		for ; to > hi; to-- {
			set.remove(rank[members[to-1]])
		}
		if !set.reaches(velocities, zero, rank[k], gap(hi-lo)) {
			out = append(out, k)
		}
	}
	return out
}

// bin returns the stretch of members around number i within half the width of
// its radius, widened on both sides in turn until it holds enough.
func bin(group []candidate, members []int, i int, width float64, enough int) (lo, hi int) {
	radius := func(j int) float64 { return group[members[j]].radius }
	n := len(members)
	lo = sort.Search(n, func(j int) bool { return radius(j) >= radius(i)-width/2 })
	hi = sort.Search(n, func(j int) bool { return radius(j) > radius(i)+width/2 })
	for hi-lo < min(enough, n) {
		// The nearer neighbour in radius joins first.
		if hi == n || (lo > 0 && radius(i)-radius(lo-1) <= radius(hi)-radius(i)) {
			lo--
		} else {
			hi++
		}
	}
	return lo, hi
}

// bitset is a set of small numbers.
type bitset []uint64

func (b bitset) add(i int)    { b[i/64] |= 1 << (i % 64) }
func (b bitset) remove(i int) { b[i/64] &^= 1 << (i % 64) }

// next returns the smallest element not below i, or −1.
func (b bitset) next(i int) int {
	for w := i / 64; w < len(b); w++ {
		word := b[w]
		if w == i/64 {
			word &= ^uint64(0) << (i % 64)
		}
		if word != 0 {
			return w*64 + bits.TrailingZeros64(word)
		}
	}
	return -1
}

// previous returns the largest element not above i, or −1.
func (b bitset) previous(i int) int {
	for w := i / 64; i >= 0 && w >= 0; w-- {
		word := b[w]
		if w == i/64 {
			word &= ^uint64(0) >> (63 - i%64)
		}
		if word != 0 {
			return w*64 + 63 - bits.LeadingZeros64(word)
		}
	}
	return -1
}

// reaches reports whether the velocity of the given rank is joined to the mean
// velocity by members of the set none of which lie more than gap apart.
func (b bitset) reaches(velocities []float64, zero, target int, gap float64) bool {
	last := 0.0
	if target >= zero {
		for r := b.next(zero); r >= 0; r = b.next(r + 1) {
			if velocities[r]-last > gap {
				return false
			}
			if r == target {
				return true
			}
			last = velocities[r]
		}
		return false
	}
	for r := b.previous(zero - 1); r >= 0; r = b.previous(r - 1) {
		if last-velocities[r] > gap {
			return false
		}
		if r == target {
			return true
		}
		last = velocities[r]
	}
	return false
}
