package dynamics

import "math"

// AndersonDarling tests whether v comes from a normal distribution of unknown
// mean and variance. It returns the statistic
//
//	A² = −N − (1/N) Σ (2i−1) [ln Φ(y_i) + ln(1−Φ(y_{N+1−i}))]
//
// of the standardised, ordered values and its p-value, from the size-corrected
// A² (1 + 0.75/N + 2.25/N²) and the fits of D'Agostino & Stephens 1986, table
// 4.9. v must hold at least 8 values that are not all equal.
func AndersonDarling(v []float64) (statistic, p float64) {
	s := sorted(v)
	n := float64(len(s))
	mean := 0.0
	for _, x := range s {
		mean += x / n
	}
	sd := standard(s, nil)
	if sd == 0 {
		return math.Inf(1), 0
	}
	sum := 0.0
	for i, x := range s {
		lower := (x - mean) / sd
		upper := (s[len(s)-1-i] - mean) / sd
		sum += float64(2*i+1) * (lnNormal(lower) + lnNormal(-upper))
	}
	statistic = -n - sum/n
	a := statistic * (1 + 0.75/n + 2.25/(n*n))
	switch {
	case a >= 0.6:
		// The quadratic turns up beyond its minimum; there p is below 1e-38.
		a = min(a, 150)
		p = math.Exp(1.2937 - 5.709*a + 0.0186*a*a)
	case a >= 0.34:
		p = math.Exp(0.9177 - 4.279*a - 1.38*a*a)
	case a >= 0.2:
		p = 1 - math.Exp(-8.318+42.796*a-59.938*a*a)
	default:
		p = 1 - math.Exp(-13.436+101.14*a-223.73*a*a)
	}
	return statistic, p
}

// lnNormal is ln Φ(x), accurate in the far lower tail.
func lnNormal(x float64) float64 {
	if x < -30 {
		// The leading terms of the asymptotic series; erfc underflows near −38.
		return -x*x/2 - math.Log(-x*math.Sqrt(2*math.Pi)) - 1/(x*x)
	}
	return math.Log(math.Erfc(-x/math.Sqrt2) / 2)
}

// Skewness tests whether the two sides of the mean differ. It returns the
// sample skewness g₁ = m₃/m₂^{3/2} and the two-sided p-value of its departure
// from a normal sample's, by the transformation of D'Agostino 1970. v must hold
// at least 8 values that are not all equal.
func Skewness(v []float64) (statistic, p float64) {
	n := float64(len(v))
	var mean, m2, m3 float64
	for _, x := range v {
		mean += x / n
	}
	for _, x := range v {
		d := x - mean
		m2 += d * d / n
		m3 += d * d * d / n
	}
	if m2 == 0 {
		return 0, 1
	}
	g := m3 / math.Pow(m2, 1.5)
	y := g * math.Sqrt((n+1)*(n+3)/(6*(n-2)))
	beta2 := 3 * (n*n + 27*n - 70) * (n + 1) * (n + 3) / ((n - 2) * (n + 5) * (n + 7) * (n + 9))
	w2 := math.Sqrt(2*(beta2-1)) - 1
	z := math.Asinh(y/math.Sqrt(2/(w2-1))) / math.Sqrt(math.Log(w2)/2)
	return g, math.Erfc(math.Abs(z) / math.Sqrt2)
}
