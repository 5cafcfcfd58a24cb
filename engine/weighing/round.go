package weighing

import (
	"fmt"
	"math"
	"strconv"
)

// decimals is how many digits behind the point an error deserves by the rule of
// the Particle Data Group (Workman et al. 2022, Review of Particle Physics,
// sect. 5.3): two significant digits when its three leading digits lie between
// 100 and 354, one between 355 and 949; from 950 the error becomes 1000 and
// keeps two, which is the same place. An error that is not positive has no
// digits to go by; it gets two decimals.
func decimals(err float64) int {
	if !(err > 0) || math.IsInf(err, 0) {
		return 2
	}
	exponent := int(math.Floor(math.Log10(err)))
	if lead := math.Round(err / math.Pow(10, float64(exponent-2))); lead < 355 {
		return 1 - exponent
	}
	return -exponent
}

// Round writes a median with its errors to the digits that the smaller error
// deserves, the digits of both alike: "5.70", "+0.42", "−0.38".
func (i Interval) Round() (median, plus, minus string) {
	up, down := i.Hi-i.Median, i.Median-i.Lo
	d := decimals(min(up, down))
	return fixed(i.Median, d), "+" + fixed(up, d), "-" + fixed(down, d)
}

// Scaled divides an interval by a unit.
func (i Interval) Scaled(unit float64) Interval {
	return Interval{i.Median / unit, i.Lo / unit, i.Hi / unit}
}

// String is "5.70 +0.42 -0.38".
func (i Interval) String() string {
	median, plus, minus := i.Round()
	return fmt.Sprintf("%s %s %s", median, plus, minus)
}

// fixed writes x with d digits behind the point; a negative d rounds before it.
func fixed(x float64, d int) string {
	if d < 0 {
		unit := math.Pow(10, float64(-d))
		return strconv.FormatFloat(math.Round(x/unit)*unit, 'f', 0, 64)
	}
	return strconv.FormatFloat(x, 'f', min(d, 12), 64)
}
