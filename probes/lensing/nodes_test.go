package lensing

import (
	"math"
	"math/rand/v2"
	"testing"

	"steelyard/probes/halo"
)

// TestAnnularMeans holds means over annuli to the reference: to its own
// tolerance with many nodes, and to the promise of areaCount with as many as
// are used.
func TestAnnularMeans(t *testing.T) {
	ref, c := readReference(t), background(t)
	nfw := halo.NewNFW(ref.Halo.M200c, ref.Halo.C200c, 200*c.CriticalDensity(ref.Halo.Redshift))
	for _, a := range ref.Annuli {
		for _, n := range []struct {
			count     int
			tolerance float64
		}{{16, 1e-10}, {areaCount(a.R1, a.R2), 1e-6}} {
			var excess, surface float64
			for _, node := range areaNodes(a.R1, a.R2, n.count) {
				excess += node.Share * nfw.ExcessSurfaceDensity(node.Radius)
				surface += node.Share * nfw.SurfaceDensity(node.Radius)
			}
			near(t, "mean ΔΣ", excess, a.Excess, n.tolerance)
			near(t, "mean Σ", surface, a.MeanOfSurface, n.tolerance)
		}
	}
}

// TestAreaCount compares the reduced shear averaged with areaCount nodes and
// with many, in narrow and wide annuli about light and heavy haloes.
func TestAreaCount(t *testing.T) {
	c := background(t)
	for _, mass := range []float64{1e13, 1e14, 1e15} {
		for _, span := range [][2]float64{{100, 110}, {200, 262}, {300, 600}, {500, 2000}, {300, 3000}} {
			mean := func(n int) float64 {
				s := signal{critical: c.SigmaCritical(0.25, math.Inf(1)), bins: []Bin{{Beta: 0.6, Beta2: 0.4, Nodes: areaNodes(span[0], span[1], n)}}, elongation: 1, distance: 1, response: 1}
				var g [1]float64
				s.predict(halo.NewNFW(mass, 5, 200*c.CriticalDensity(0.25)), g[:])
				return g[0]
			}
			near(t, "mean g", mean(areaCount(span[0], span[1])), mean(60), 1e-6)
		}
	}
	// A disc has no inner edge.
	total := 0.0
	for _, n := range areaNodes(0, 100, areaCount(0, 100)) {
		total += n.Share * n.Radius
	}
	near(t, "mean radius of a disc", total, 200.0/3, 1e-6) // what the missing core weighs
}

// TestMomentNodes averages a curved function over scattered sources, all of
// them and by three nodes.
func TestMomentNodes(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	const inner, outer = 200.0, 262.0
	nfw := halo.NewNFW(1e15, 5, 200*background(t).CriticalDensity(0.25))
	for _, n := range []int{1, 2, 3, 4, 10, 1000} {
		var m [moments]float64
		var want, total, mean float64
		for range n {
			r, w := inner+(outer-inner)*rng.Float64(), rng.Float64()
			u, power := 2*math.Log(r/inner)/math.Log(outer/inner)-1, w
			for k := range m {
				m[k] += power
				power *= u
			}
			want += w * nfw.ExcessSurfaceDensity(r)
			mean += w * r
			total += w
		}
		var got, share, radius float64
		nodes := momentNodes(m[:], inner, outer)
		for _, node := range nodes {
			got += node.Share * nfw.ExcessSurfaceDensity(node.Radius)
			share += node.Share
			radius += node.Share * node.Radius
			if !(node.Radius > inner*0.999 && node.Radius < outer*1.001 && node.Share > 0) {
				t.Errorf("%d sources: a node at %g kpc with a share of %g", n, node.Radius, node.Share)
			}
		}
		if len(nodes) != min(n, 3) {
			t.Errorf("%d sources make %d nodes", n, len(nodes))
		}
		near(t, "shares", share, 1, 1e-12) // rounding
		// Three nodes are exact to the fifth power of the half width, 0.135.
		near(t, "mean ΔΣ", got, want/total, 1e-6)
		near(t, "mean radius", radius, mean/total, 1e-6)
	}
}
