package xray

import "math"

// shellMeans returns a function that fills out with the root mean square of n_e
// in every shell, which is what a deprojected emission measure yields.
func shellMeans(form Form, shells *Bins) func(p, out []float64) {
	var r, weight []float64 // quadrature nodes, kpc; weights of n², summing to one over a shell
	var end []int           // for each shell, one past its last node
	for i, inner := range shells.Inner {
		outer := shells.Outer[i]
		half, middle := (outer-inner)/2, (outer+inner)/2
		volume := outer*outer*outer - inner*inner*inner
		add := func(s, ds float64) {
			r = append(r, s)
			weight = append(weight, 3*s*s*ds/volume)
		}
		// Two nodes do for a shell that spans little of a smooth function, ten for
		// one that spans much, as the innermost may.
		if inner > 0 && outer/inner <= 1.5 {
			add(middle-half/math.Sqrt(3), half)
			add(middle+half/math.Sqrt(3), half)
		} else {
			for q, x := range gauss.x {
				add(middle+half*x, half*gauss.w[q])
			}
		}
		end = append(end, len(r))
	}
	return func(p, out []float64) {
		j := 0
		for i, e := range end {
			var sum float64
			for ; j < e; j++ {
				sum += weight[j] * math.Exp(2*form.lnElectrons(p, r[j]))
			}
			out[i] = math.Sqrt(sum)
		}
	}
}
