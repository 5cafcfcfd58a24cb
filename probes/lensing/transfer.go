package lensing

import "math"

// transfer is the transfer function of Eisenstein & Hu 1998 (ApJ 496, 605) for
// cold dark matter and baryons, wiggles included; the numbers in brackets are
// its equations. Wavenumbers in 1/Mpc.
type transfer struct {
	baryons, cold float64 // shares of the matter
	equality      float64 // k_eq
	sound         float64 // sound horizon s, Mpc
	silk          float64
	alphaC, betaC float64
	alphaB, betaB float64
	node          float64
}

// cmb is the temperature of the microwave background in K (Fixsen 2009, ApJ
// 707, 916), which the fit needs even where the background leaves out photons.
const cmb = 2.7255

// newTransfer prepares the function for Ω_m h² and Ω_b h².
func newTransfer(matter, baryon float64) transfer {
	theta := cmb / 2.7
	t2 := theta * theta
	fb := baryon / matter
	fc := 1 - fb
	zEquality := 2.5e4 * matter / (t2 * t2)                                                                       // (2)
	kEquality := 7.46e-2 * matter / t2                                                                            // (3)
	b1 := 0.313 * math.Pow(matter, -0.419) * (1 + 0.607*math.Pow(matter, 0.674))                                  // (4)
	b2 := 0.238 * math.Pow(matter, 0.223)                                                                         //
	zDrag := 1291 * math.Pow(matter, 0.251) / (1 + 0.659*math.Pow(matter, 0.828)) * (1 + b1*math.Pow(baryon, b2)) //
	ratio := func(z float64) float64 { return 31.5 * baryon / (t2 * t2) * (1000 / z) }                            // (5)
	rDrag, rEquality := ratio(zDrag), ratio(zEquality)
	sound := 2 / (3 * kEquality) * math.Sqrt(6/rEquality) *
		math.Log((math.Sqrt(1+rDrag)+math.Sqrt(rDrag+rEquality))/(1+math.Sqrt(rEquality))) // (6)
	silk := 1.6 * math.Pow(baryon, 0.52) * math.Pow(matter, 0.73) * (1 + math.Pow(10.4*matter, -0.95)) // (7)
	a1 := math.Pow(46.9*matter, 0.670) * (1 + math.Pow(32.1*matter, -0.532))                           // (11)
	a2 := math.Pow(12.0*matter, 0.424) * (1 + math.Pow(45.0*matter, -0.582))
	c1 := 0.944 / (1 + math.Pow(458*matter, -0.708)) // (12)
	c2 := math.Pow(0.395*matter, -0.0266)
	y := (1 + zEquality) / (1 + zDrag)
	root := math.Sqrt(1 + y)
	g := y * (-6*root + (2+3*y)*math.Log((root+1)/(root-1))) // (15)
	return transfer{
		baryons: fb, cold: fc, equality: kEquality, sound: sound, silk: silk,
		alphaC: math.Pow(a1, -fb) * math.Pow(a2, -fb*fb*fb),
		betaC:  1 / (1 + c1*(math.Pow(fc, c2)-1)),
		alphaB: 2.07 * kEquality * sound * math.Pow(1+rDrag, -0.75) * g,  // (14)
		betaB:  0.5 + fb + (3-2*fb)*math.Sqrt(17.2*matter*17.2*matter+1), // (24)
		node:   8.41 * math.Pow(matter, 0.435),                           // (23)
	}
}

// at is T(k), one where k is small.
func (t transfer) at(k float64) float64 {
	q := k / (13.41 * t.equality) // (10)
	shape := func(alpha, beta float64) float64 {
		c := 14.2/alpha + 386/(1+69.9*math.Pow(q, 1.08)) // (20)
		l := math.Log(math.E + 1.8*beta*q)
		return l / (l + c*q*q) // (19)
	}
	ks := k * t.sound
	f := 1 / (1 + math.Pow(ks/5.4, 4))                           // (18)
	cold := f*shape(1, t.betaC) + (1-f)*shape(t.alphaC, t.betaC) // (17)
	shifted := ks / math.Cbrt(1+math.Pow(t.node/ks, 3))          // (22)
	wave := math.Sin(shifted) / shifted                          // j0
	baryons := (shape(1, 1)/(1+ks*ks/(5.2*5.2)) +
		t.alphaB/(1+math.Pow(t.betaB/ks, 3))*math.Exp(-math.Pow(k/t.silk, 1.4))) * wave // (21)
	return t.baryons*baryons + t.cold*cold // (16)
}
