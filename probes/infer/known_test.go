package infer

import (
	"fmt"
	"math"
	"sort"

	"steelyard/probes/prior"
)

// known is a posterior whose answers are known in closed form or by quadrature
// in one dimension.
type known struct {
	name    string
	problem Problem
	lnZ     float64
	// cdf[j] is the marginal distribution function of parameter j, nil where it
	// is not known.
	cdf []func(x float64) float64
}

func must(p prior.Prior, err error) prior.Prior {
	if err != nil {
		panic(err)
	}
	return p
}

func free(priors ...prior.Prior) []Free {
	out := make([]Free, len(priors))
	for j, p := range priors {
		out[j] = Free{Name: fmt.Sprintf("x%d", j+1), Prior: p}
	}
	return out
}

// plain wraps a likelihood that needs no scratch space.
func plain(l func(x []float64) float64) func() func([]float64) float64 {
	return func() func([]float64) float64 { return l }
}

var uniform40 = must(prior.Uniform(-40, 40))

func phi(x float64) float64 { return math.Erfc(-x/math.Sqrt2) / 2 }

func lnNormal(x, sd float64) float64 { return -x*x/sd/sd/2 - math.Log(sd) - lnRoot2Pi }

func normalCDF(mean, sd float64) func(float64) float64 {
	return func(x float64) float64 { return phi((x - mean) / sd) }
}

// tabulated returns the distribution function with the given log density, and
// the log of its integral, by the trapezoidal rule on n points.
func tabulated(lnDensity func(float64) float64, from, to float64, n int) (cdf func(float64) float64, lnIntegral float64) {
	h := (to - from) / float64(n-1)
	f, most := make([]float64, n), math.Inf(-1)
	for i := range f {
		f[i] = lnDensity(from + h*float64(i))
		most = max(most, f[i])
	}
	sum := make([]float64, n)
	for i := 1; i < n; i++ {
		sum[i] = sum[i-1] + h*(math.Exp(f[i-1]-most)+math.Exp(f[i]-most))/2
	}
	total := sum[n-1]
	return func(x float64) float64 {
		at := min(max((x-from)/h, 0), float64(n-1))
		i := min(int(at), n-2)
		return (sum[i] + (at-float64(i))*(sum[i+1]-sum[i])) / total
	}, most + math.Log(total)
}

// gaussian has unit normal priors and data y = x + noise of sd s with correlation
// rho between neighbours: normal in closed form, diagonalised by its symmetry.
// The likelihood's covariance is s²(I + rho·J)/(1+rho) with J the matrix of ones,
// whose eigenvalues are s²(1+rho·d)/(1+rho) once and s²/(1+rho) else.
func gaussian(d int, s, rho float64) known {
	big, small := s*s*(1+rho*float64(d))/(1+rho), s*s/(1+rho)
	y := make([]float64, d)
	for j := range y {
		y[j] = 0.7 - 0.2*float64(j)
	}
	ones := func(x []float64) (along, across float64) { // squared parts along J's vector and across it
		sum, square := 0.0, 0.0
		for _, v := range x {
			sum += v
			square += v * v
		}
		along = sum * sum / float64(d)
		return along, square - along
	}
	lnN := func(x []float64, b, c float64) float64 {
		along, across := ones(x)
		return -along/b/2 - across/c/2 - math.Log(b)/2 - float64(d-1)*math.Log(c)/2 - float64(d)*lnRoot2Pi
	}
	k := known{name: fmt.Sprintf("gaussian %d-d rho %g", d, rho)}
	for range d {
		k.problem.Free = append(k.problem.Free, free(must(prior.Normal(0, 1)))...)
	}
	k.problem.Likelihood = func() func([]float64) float64 {
		diff := make([]float64, d)
		return func(x []float64) float64 {
			for j := range x {
				diff[j] = y[j] - x[j]
			}
			return lnN(diff, big, small)
		}
	}
	k.lnZ = lnN(y, big+1, small+1)
	mean := 0.0
	for _, v := range y {
		mean += v / float64(d)
	}
	for j := range y {
		m := mean/(1+big) + (y[j]-mean)/(1+small)
		v := big/(1+big)/float64(d) + small/(1+small)*(1-1/float64(d))
		k.cdf = append(k.cdf, normalCDF(m, math.Sqrt(v)))
	}
	return k
}

// banana bends a normal: x2 = x1² + noise of sd w, x1 = 1 + noise of sd s.
func banana(s, w float64) known {
	k := known{name: fmt.Sprintf("banana %g %g", s, w)}
	k.problem.Free = free(must(prior.Uniform(-20, 20)), must(prior.Uniform(-100, 400)))
	k.problem.Likelihood = plain(func(x []float64) float64 {
		return lnNormal(x[0]-1, s) + lnNormal(x[1]-x[0]*x[0], w)
	})
	k.lnZ = -math.Log(40) - math.Log(500)
	// x2 given x1 is far from its limits.
	k.cdf = []func(float64) float64{normalCDF(1, s), func(b float64) float64 {
		sum, norm := 0.0, 0.0
		for i := -4000; i <= 4000; i++ {
			a := 1 + s*float64(i)/500
			e := math.Exp(lnNormal(a-1, s))
			norm += e
			sum += e * phi((b-a*a)/w)
		}
		return sum / norm
	}}
	return k
}

// edge is piled at the upper limit of a uniform prior: L = exp(−(1−x)/scale).
func edge(d int, scale float64) known {
	k := known{name: fmt.Sprintf("edge %d-d %g", d, scale)}
	for range d {
		k.problem.Free = append(k.problem.Free, free(must(prior.Uniform(0, 1)))...)
		k.cdf = append(k.cdf, func(x float64) float64 {
			return math.Exp(-(1-x)/scale) * -math.Expm1(-x/scale) / -math.Expm1(-1/scale)
		})
	}
	k.problem.Likelihood = plain(func(x []float64) float64 {
		sum := 0.0
		for _, v := range x {
			sum -= (1 - v) / scale
		}
		return sum
	})
	k.lnZ = float64(d) * math.Log(scale*-math.Expm1(-1/scale))
	return k
}

// half is a half-normal prior pressed against zero by a measurement below it.
func half(y, s float64) known {
	k := known{name: fmt.Sprintf("half-normal %g %g", y, s)}
	k.problem.Free = free(must(prior.HalfNormal(1)))
	k.problem.Likelihood = plain(func(x []float64) float64 { return lnNormal(x[0]-y, s) })
	m, sd := y/(1+s*s), s/math.Sqrt(1+s*s)
	above := func(x float64) float64 { return phi((m - x) / sd) }
	k.lnZ = math.Ln2 + lnNormal(y, math.Sqrt(1+s*s)) + math.Log(above(0))
	k.cdf = []func(float64) float64{func(x float64) float64 { return 1 - above(x)/above(0) }}
	return k
}

// cauchy has Cauchy likelihoods of unit width far inside uniform priors.
func cauchy(d int, reach float64) known {
	k := known{name: fmt.Sprintf("cauchy %d-d %g", d, reach)}
	for range d {
		k.problem.Free = append(k.problem.Free, free(must(prior.Uniform(-reach, reach)))...)
		k.cdf = append(k.cdf, func(x float64) float64 { return (math.Atan(x)/math.Atan(reach) + 1) / 2 })
	}
	k.problem.Likelihood = plain(func(x []float64) float64 {
		sum := 0.0
		for _, v := range x {
			sum -= math.Log(math.Pi * (1 + v*v))
		}
		return sum
	})
	k.lnZ = float64(d) * math.Log(2*math.Atan(reach)/math.Pi/2/reach)
	return k
}

// student is a multivariate t with three degrees of freedom inside uniform
// priors that reach far enough to hold all but a little of it; each marginal
// is a t, cut at the limits.
func student(d int) known {
	const nu, reach = 3.0, 400.0
	k := known{name: fmt.Sprintf("student %d-d", d)}
	cdf := func(x float64) float64 { // t with 3 degrees of freedom, closed form
		u := x / math.Sqrt(3)
		return 0.5 + (u/(1+u*u)+math.Atan(u))/math.Pi
	}
	for range d {
		k.problem.Free = append(k.problem.Free, free(must(prior.Uniform(-reach, reach)))...)
		k.cdf = append(k.cdf, cdf)
	}
	top, _ := math.Lgamma((nu + float64(d)) / 2)
	bottom, _ := math.Lgamma(nu / 2)
	norm := top - bottom - float64(d)/2*math.Log(nu*math.Pi)
	k.problem.Likelihood = plain(func(x []float64) float64 {
		sum := 0.0
		for _, v := range x {
			sum += v * v
		}
		return norm - (nu+float64(d))/2*math.Log1p(sum/nu)
	})
	k.lnZ = -float64(d) * math.Log(2*reach)
	return k
}

// modes has normal modes of sd s, each the given number of sd from the next
// along the diagonal, with the given shares, in a uniform prior of ±50.
func severalModes(d int, s, apart float64, shares ...float64) known {
	k := known{name: fmt.Sprintf("%d modes %d-d sd %g, %g sd apart", len(shares), d, s, apart)}
	centre := make([]float64, len(shares))
	for m := range shares {
		centre[m] = s * apart / math.Sqrt(float64(d)) * (float64(m) - float64(len(shares)-1)/2)
	}
	for range d {
		k.problem.Free = append(k.problem.Free, free(must(prior.Uniform(-50, 50)))...)
		k.cdf = append(k.cdf, func(x float64) float64 {
			sum := 0.0
			for m, w := range shares {
				sum += w * phi((x-centre[m])/s)
			}
			return sum
		})
	}
	k.problem.Likelihood = plain(func(x []float64) float64 {
		total := math.Inf(-1)
		for m, w := range shares {
			l := math.Log(w)
			for _, v := range x {
				l += lnNormal(v-centre[m], s)
			}
			total = lnAdd(total, l)
		}
		return total
	})
	k.lnZ = -float64(d) * math.Log(100)
	return k
}

// narrow is a normal of 1e-4 of the prior's width, off centre.
func narrow(d int) known {
	k := known{name: fmt.Sprintf("narrow %d-d", d)}
	for j := range d {
		at := 0.3 + 0.1*float64(j)
		k.problem.Free = append(k.problem.Free, free(must(prior.Uniform(0, 1)))...)
		k.cdf = append(k.cdf, normalCDF(at, 1e-4))
	}
	k.problem.Likelihood = plain(func(x []float64) float64 {
		sum := 0.0
		for j, v := range x {
			sum += lnNormal(v-0.3-0.1*float64(j), 1e-4)
		}
		return sum
	})
	return k
}

// funnel has x_i normal with variance e^v, and v normal of sd s.
func funnel(d int, s float64) known {
	const reach = 100
	k := known{name: fmt.Sprintf("funnel %d-d %g", d, s)}
	k.problem.Free = free(must(prior.Normal(0, s)))
	for range d - 1 {
		k.problem.Free = append(k.problem.Free, free(must(prior.Uniform(-reach, reach)))...)
	}
	k.problem.Likelihood = plain(func(x []float64) float64 {
		sum := 0.0
		for _, v := range x[1:] {
			sum += lnNormal(v, math.Exp(x[0]/2))
		}
		return sum
	})
	cdf, lnZ := tabulated(func(v float64) float64 {
		inside := 1 - 2*phi(-reach*math.Exp(-v/2))
		return lnNormal(v, s) + float64(d-1)*math.Log(max(inside, 1e-300))
	}, -9*s, 9*s, 20001)
	k.lnZ = lnZ - float64(d-1)*math.Log(2*reach)
	k.cdf = append([]func(float64) float64{cdf}, make([]func(float64) float64, d-1)...)
	return k
}

// ring is a circle of radius 3 with a normal profile of sd w, in ±10.
func ring(w float64) known {
	k := known{name: fmt.Sprintf("ring %g", w)}
	k.problem.Free = free(must(prior.Uniform(-10, 10)), must(prior.Uniform(-10, 10)))
	k.problem.Likelihood = plain(func(x []float64) float64 {
		return lnNormal(math.Hypot(x[0], x[1])-3, w)
	})
	_, ln := tabulated(func(r float64) float64 { return math.Log(r) + lnNormal(r-3, w) }, 1e-9, 3+12*w, 20001)
	k.lnZ = ln + math.Log(2*math.Pi) - math.Log(400)
	k.cdf = make([]func(float64) float64, 2)
	return k
}

// box has a likelihood that is 1 inside a cube of the prior and impossible outside.
func box(d int, side float64) known {
	k := known{name: fmt.Sprintf("box %d-d %g", d, side)}
	for range d {
		k.problem.Free = append(k.problem.Free, free(must(prior.Uniform(0, 1)))...)
		k.cdf = append(k.cdf, func(x float64) float64 { return min(max((x-0.6)/side, 0), 1) })
	}
	k.problem.Likelihood = plain(func(x []float64) float64 {
		for _, v := range x {
			if v < 0.6 || v > 0.6+side {
				return math.Inf(-1)
			}
		}
		return 0
	})
	k.lnZ = float64(d) * math.Log(side)
	return k
}

// flat has a likelihood that says nothing: the posterior is the prior.
func flat(d int) known {
	k := known{name: fmt.Sprintf("flat %d-d", d)}
	for range d {
		k.problem.Free = append(k.problem.Free, free(must(prior.LogNormal(4, 0.3)))...)
		k.cdf = append(k.cdf, func(x float64) float64 { return phi(math.Log(x/4) / 0.3) })
	}
	k.problem.Likelihood = plain(func([]float64) float64 { return -3 })
	k.lnZ = -3
	return k
}

// wrongness is how far a sample is from the truth in units of what its own
// effective size allows: the worst, over parameters and the true 2.5, 16, 50,
// 84 and 97.5 percentiles, of the share of draws below against the
// percentile; and the error of the evidence over its stated error.
func (k known) wrongness(s *Sample) (interval, evidence float64) {
	for j, cdf := range k.cdf {
		if cdf == nil {
			continue
		}
		x := make([]float64, len(s.Values))
		for i, v := range s.Values {
			x[i] = v[j]
		}
		sort.Float64s(x)
		for _, p := range []float64{0.025, 0.16, 0.5, 0.84, 0.975} {
			below := sort.Search(len(x), func(i int) bool { return cdf(x[i]) >= p })
			pull := (float64(below)/float64(len(x)) - p) / math.Sqrt(p*(1-p)/s.Quality.EffectiveDraws)
			interval = max(interval, math.Abs(pull))
		}
	}
	if s.Quality.HasEvidence {
		evidence = math.Abs(s.Quality.LogEvidence-k.lnZ) / s.Quality.EvidenceError
	}
	return interval, evidence
}
