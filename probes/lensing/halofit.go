package lensing

import "math"

// halofit holds, for one redshift, the non-linear scale of Smith et al. 2003
// (MNRAS 341, 1311) and the coefficients that Takahashi et al. 2012 (ApJ 761,
// 152, appendix) fitted to simulations; the coefficients from memory.
type halofit struct {
	growth2                         float64 // of the linear power
	scale                           float64 // k_σ, 1/Mpc; 0 where nothing is non-linear yet
	a, b, c, gamma, alpha, beta, nu float64
	f1, f2, f3                      float64
}

// power is the non-linear power at wavenumber k and redshift z.
func (s *spectrum) power(k, z float64) float64 {
	f, ok := s.nonlinear[z]
	if !ok {
		f = s.fit(z)
		s.nonlinear[z] = f
	}
	linear := f.growth2 * s.today(k)
	if f.scale == 0 {
		return linear
	}
	volume := k * k * k / (2 * math.Pi * math.Pi)
	d, y := volume*linear, k/f.scale
	quasi := d * math.Pow(1+d, f.beta) / (1 + f.alpha*d) * math.Exp(-y/4-y*y/8)
	halo := f.a * math.Pow(y, 3*f.f1) / (1 + f.b*math.Pow(y, f.f2) + math.Pow(f.c*f.f3*y, 3-f.gamma))
	halo /= 1 + f.nu/(y*y)
	return (quasi + halo) / volume
}

// fit finds where the linear density, smoothed by a Gaussian of radius R, has
// an rms of one, and the slope and curvature of its variance there:
//
//	n = −3 − d ln σ²/d ln R,   C = −d² ln σ²/d ln R².
func (s *spectrum) fit(z float64) halofit {
	d := s.background.GrowthFactor(z)
	f := halofit{growth2: d * d}
	// σ² and its first two derivatives in ln R; x = kR.
	variance := func(R float64) (v, slope, bend float64) {
		const step = 0.04
		for lnX := math.Log(1e-4); lnX < math.Log(6); lnX += step {
			x := math.Exp(lnX)
			k := x / R
			w := f.growth2 * s.today(k) * k * k * k / (2 * math.Pi * math.Pi) * math.Exp(-x*x) * step
			v += w
			slope -= 2 * x * x * w
			bend += (4*x*x*x*x - 4*x*x) * w
		}
		return v, slope, bend
	}
	lo, hi := math.Log(1e-4), math.Log(100.0)
	if v, _, _ := variance(math.Exp(lo)); v < 1 {
		return f
	}
	lnR := math.Log(0.5)
	for range 100 { // Newton's steps in ln σ² over ln R, inside a bracket
		v, slope, _ := variance(math.Exp(lnR))
		if v > 1 {
			lo = lnR
		} else {
			hi = lnR
		}
		next := lnR - math.Log(v)*v/slope
		if !(next > lo && next < hi) {
			next = (lo + hi) / 2
		}
		if math.Abs(next-lnR) < 1e-10 {
			break
		}
		lnR = next
	}
	R := math.Exp(lnR)
	v, slope, bend := variance(R)
	n := -3 - slope/v
	c := slope*slope/(v*v) - bend/v
	matter := s.background.OmegaMatter(z)
	q := s.background.Params()
	dark, w := 1-matter, q.W0+q.Wa*z/(1+z)
	power := func(x float64) float64 { return math.Pow(10, x) }
	f.scale = 1 / R
	f.a = power(1.5222 + 2.8553*n + 2.3706*n*n + 0.9903*n*n*n + 0.2250*n*n*n*n - 0.6038*c + 0.1749*dark*(1+w))
	f.b = power(-0.5642 + 0.5864*n + 0.5716*n*n - 1.5474*c + 0.2279*dark*(1+w))
	f.c = power(0.3698 + 2.0404*n + 0.8161*n*n + 0.5869*c)
	f.gamma = 0.1971 - 0.0843*n + 0.8460*c
	f.alpha = math.Abs(6.0835 + 1.3373*n - 0.1959*n*n - 5.5274*c)
	f.beta = 2.0379 - 0.7354*n + 0.3157*n*n + 1.2490*n*n*n + 0.3980*n*n*n*n - 0.1682*c
	f.nu = power(5.2105 + 3.6902*n)
	f.f1, f.f2, f.f3 = math.Pow(matter, -0.0307), math.Pow(matter, -0.0585), math.Pow(matter, 0.0743)
	return f
}
