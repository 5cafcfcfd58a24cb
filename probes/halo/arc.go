package halo

import "math"

// arc is the function that the projections of cuspy profiles share,
//
//	A(x) = arccosh(1/x)/√(1−x²) below x = 1,   arccos(1/x)/√(x²−1) above,   A(1) = 1.
//
// Near x = 1, where the quotient loses its digits, it is the series
// A = (1+u)(1 + u/3 + u²/5 + …) in u = (1−x)/(1+x), which runs through x = 1.
func arc(x float64) float64 {
	switch {
	case math.Abs(x-1) < nearOne:
		u := (1 - x) / (1 + x)
		return (1 + u) * (1 + u*(1.0/3+u*(1.0/5+u*(1.0/7+u*(1.0/9+u*(1.0/11+u*(1.0/13+u/15)))))))
	case x < 1:
		q := math.Sqrt((1 - x) * (1 + x))
		return math.Log((1+q)/x) / q
	default:
		q := math.Sqrt((x - 1) * (x + 1))
		return math.Atan(q) / q
	}
}

// nearOne is the distance from x = 1 within which series are used. There
// |u| < 0.0153, so that eight terms reach 1e-15; outside, the difference 1 − A
// still keeps 14 digits.
const nearOne = 0.03

// surfaceFactor is (1 − A)/(x² − 1), which is Σ of an NFW halo in units of
// 2ρ_s r_s; a is A(x). Near x = 1 it is
//
//	(1+u)²/4 · Σ_k (4k+4)/((2k+1)(2k+3)) u^k.
func surfaceFactor(x, a float64) float64 {
	if math.Abs(x-1) < nearOne {
		u := (1 - x) / (1 + x)
		s := 4.0/3 + u*(8.0/15+u*(12.0/35+u*(16.0/63+u*(20.0/99+u*(24.0/143+u*(28.0/195+u*32.0/255))))))
		return (1 + u) * (1 + u) / 4 * s
	}
	return (1 - a) / ((x - 1) * (x + 1))
}
