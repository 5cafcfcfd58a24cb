package recipes

import (
	"fmt"
	"math/big"
	"regexp"
	"strings"

	"steelyard/probes/units"
)

// sky reads sky(ra, dec), ICRS, in radians.
func (l *loader) sky(t term) (ra, dec float64, ok bool) {
	const form = "Write centre = sky(\"14h01m02.1s\", \"+02d52m42s\"), or in degrees: sky(210.2588, 2.8783)."
	if t.kind == badTerm {
		return 0, 0, false
	}
	if t.kind == callTerm && t.name != "sky" && nearest(t.name, functions) == "sky" {
		l.unknownFunction(t, "sky")
		return 0, 0, false
	}
	if !t.is("sky") {
		l.add(problem{at: t.at, what: fmt.Sprintf("a position is sky(ra, dec), not %s", t.describe()), write: form})
		return 0, 0, false
	}
	if !l.count(t, []string{"ra", "dec"}, 2) {
		return 0, 0, false
	}
	ra, ok = l.angle(t.items[0], "right ascension", "14h01m02.1s", true)
	dec, good := l.angle(t.items[1], "declination", "+02d52m42s", false)
	return ra, dec, ok && good
}

// angle reads one coordinate; hours says whether it is a right ascension.
func (l *loader) angle(t term, name, example string, hours bool) (float64, bool) {
	var degrees *big.Rat
	var err error
	switch t.kind {
	case badTerm:
		return 0, false
	case numberTerm:
		degrees = t.number
	case textTerm:
		if degrees, err = parseAngle(t.text, hours); err != nil {
			l.add(problem{at: t.at, what: fmt.Sprintf("the %s cannot be read", name), why: sentence(err.Error()), write: fmt.Sprintf("Write it like %q, or in decimal degrees.", example)})
			return 0, false
		}
	default:
		l.add(problem{at: t.at, what: fmt.Sprintf("the %s is a number or a text, not %s", name, t.describe()), write: fmt.Sprintf("Write it like %q, or in decimal degrees.", example)})
		return 0, false
	}
	low, high := big.NewRat(-90, 1), big.NewRat(90, 1)
	limits := "between -90 and 90 degrees"
	outside := degrees.Cmp(low) < 0 || degrees.Cmp(high) > 0
	if hours {
		limits = "from 0 to below 360 degrees, or 0h to below 24h"
		outside = degrees.Sign() < 0 || degrees.Cmp(big.NewRat(360, 1)) >= 0
	}
	if outside {
		l.add(problem{at: t.at, what: fmt.Sprintf("the %s is out of range", name), why: fmt.Sprintf("It lies %s.", limits)})
		return 0, false
	}
	factor, err := units.Factor(units.MustParse("deg"), units.MustParse("rad"))
	if err != nil {
		panic("recipes: " + err.Error())
	}
	return float(new(big.Rat).Mul(degrees, factor)), true
}

// The ways of writing a coordinate: decimal degrees, sexagesimal with letters
// or signs, sexagesimal with colons or spaces.
var (
	decimalAngle = regexp.MustCompile(`^([+-]?)(\d{1,3}(?:\.\d{0,30})?)\s*(?:deg|°)?$`)
	markedAngle  = regexp.MustCompile(`^([+-]?)\s*(\d{1,3})\s*([hd°])\s*(?:(\d{1,2})\s*[m'′]\s*(?:(\d{1,2}(?:\.\d{0,30})?)\s*(?:s|"|″|'')?)?)?$`)
	columnAngle  = regexp.MustCompile(`^([+-]?)\s*(\d{1,3})[:\s]+(\d{1,2})[:\s]+(\d{1,2}(?:\.\d{0,30})?)$`)
)

// parseAngle reads a coordinate as degrees. Three numbers divided by colons or
// spaces are hours, minutes and seconds for a right ascension, as is usual.
func parseAngle(text string, hours bool) (*big.Rat, error) {
	text = strings.TrimSpace(strings.ReplaceAll(text, "−", "-"))
	if m := decimalAngle.FindStringSubmatch(text); m != nil {
		return signed(m[1], m[2], "", "", 1)
	}
	if m := markedAngle.FindStringSubmatch(text); m != nil {
		scale := int64(1)
		if m[3] == "h" {
			if !hours {
				return nil, fmt.Errorf("a declination is counted in degrees, not in hours")
			}
			scale = 15
		}
		return signed(m[1], m[2], m[4], m[5], scale)
	}
	if m := columnAngle.FindStringSubmatch(text); m != nil {
		scale := int64(1)
		if hours {
			scale = 15
		}
		return signed(m[1], m[2], m[3], m[4], scale)
	}
	return nil, fmt.Errorf("%q is neither decimal degrees nor a sexagesimal angle", text)
}

// signed adds up a sexagesimal angle and multiplies it by a scale.
func signed(sign, whole, minutes, seconds string, scale int64) (*big.Rat, error) {
	sum := new(big.Rat)
	for i, part := range []string{whole, minutes, seconds} {
		if part == "" {
			continue
		}
		x, ok := new(big.Rat).SetString(strings.TrimSuffix(part, "."))
		if !ok {
			return nil, fmt.Errorf("%q is not a number", part)
		}
		if i > 0 && x.Cmp(big.NewRat(60, 1)) >= 0 {
			return nil, fmt.Errorf("minutes and seconds stay below 60")
		}
		sum.Add(sum, x.Mul(x, big.NewRat(1, []int64{1, 60, 3600}[i])))
	}
	sum.Mul(sum, big.NewRat(scale, 1))
	if sign == "-" {
		sum.Neg(sum)
	}
	return sum, nil
}
