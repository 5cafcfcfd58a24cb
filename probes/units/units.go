// Package units reads quantities, numbers with a unit and perhaps an error, and
// converts them exactly.
//
// A number stays an exact decimal until it has been multiplied by the exact
// factor between two units; it is rounded to float64 once. Thus 1.001 Mpc is
// 1001 kpc and 70 km/s/Mpc is 70 in km/s/Mpc, to the last bit. Factors are
// rational numbers; where π enters (degrees, the parsec) a rational π of 60
// digits stands for it, so that it cancels exactly wherever it should.
//
// Parse reads a unit, ParseQuantity a number with errors and unit, Factor and
// Converter convert. Every message says what was read and what was expected.
package units

import (
	"fmt"
	"math/big"
)

// Unit is a parsed unit: an exact (or, where π enters, 60-digit) scale to the
// base units (metre, kilogram, second, radian, kelvin, count, photon,
// magnitude) and the powers of its dimensions. The zero value is the pure
// number.
type Unit struct {
	scale *big.Rat // nil stands for 1
	dim   Dimension
	text  string
}

// Dimension holds the powers of the base dimensions, in the order of baseNames.
type Dimension [8]int8

const (
	length = iota
	mass
	time
	angle
	temperature
	count
	photon
	magnitude
)

var baseNames = [len(Dimension{})]string{"length", "mass", "time", "angle", "temperature", "count", "photon", "magnitude"}

// MustParse is Parse for constants of the program; it panics on an error.
func MustParse(text string) Unit {
	u, err := Parse(text)
	if err != nil {
		panic("units: " + err.Error())
	}
	return u
}

// String returns the unit in VOUnits spelling: "km/s", "cm**-3",
// "10**14solMass". The pure number is "".
func (u Unit) String() string { return u.text }

// SameDimension reports whether quantities of the two units can be compared.
func SameDimension(a, b Unit) bool { return a.dim == b.dim }

// Equal reports whether two units are the same, however they are spelt.
func Equal(a, b Unit) bool { return a.dim == b.dim && a.size().Cmp(b.size()) == 0 }

// IsLength reports whether the unit is one of length.
func (u Unit) IsLength() bool { return u.dim == Dimension{length: 1} }

// IsAngle reports whether the unit is one of plane angle.
func (u Unit) IsAngle() bool { return u.dim == Dimension{angle: 1} }

// IsPure reports whether the unit is a pure number, percent included.
func (u Unit) IsPure() bool { return u.dim == Dimension{} }

// size returns the scale, 1 for the zero value.
func (u Unit) size() *big.Rat {
	if u.scale == nil {
		return big.NewRat(1, 1)
	}
	return u.scale
}

// Factor returns what a number in unit from is multiplied by to be in unit to.
// It is an error when the two have different dimensions.
func Factor(from, to Unit) (*big.Rat, error) {
	if from.dim != to.dim {
		hint := ""
		if from.dim == dimensions["temperature"] && to.dim == dimensions["energy"] {
			hint = "; X-ray temperatures are given as kT, an energy (1 keV is k times 1.160e7 K)"
		}
		return nil, fmt.Errorf("%s cannot be converted to %s: %s is not %s%s",
			from.name(), to.name(), from.dim.article(), to.dim.article(), hint)
	}
	return new(big.Rat).Quo(from.size(), to.size()), nil
}

// name returns the unit for messages.
func (u Unit) name() string {
	if u.text == "" {
		return "a number without a unit"
	}
	return u.text
}

// dimensions names the powers that occur in this program.
var dimensions = map[string]Dimension{
	"pure number":       {},
	"length":            {length: 1},
	"area":              {length: 2},
	"volume":            {length: 3},
	"mass":              {mass: 1},
	"time":              {time: 1},
	"angle":             {angle: 1},
	"solid angle":       {angle: 2},
	"temperature":       {temperature: 1},
	"speed":             {length: 1, time: -1},
	"acceleration":      {length: 1, time: -2},
	"energy":            {mass: 1, length: 2, time: -2},
	"luminosity":        {mass: 1, length: 2, time: -3},
	"pressure":          {mass: 1, length: -1, time: -2},
	"number density":    {length: -3},
	"density":           {mass: 1, length: -3},
	"surface density":   {mass: 1, length: -2},
	"rate":              {time: -1},
	"number of counts":  {count: 1},
	"number of photons": {photon: 1},
	"magnitude":         {magnitude: 1},
}

// Describe names the dimension of the unit: "length", "number density", or the
// powers of the base dimensions when it has no name.
func (u Unit) Describe() string { return u.dim.String() }

// String implements fmt.Stringer.
func (d Dimension) String() string {
	for name, other := range dimensions {
		if d == other {
			return name
		}
	}
	text := ""
	for i, power := range d {
		if power == 0 {
			continue
		}
		if text != "" {
			text += "."
		}
		text += baseNames[i]
		if power != 1 {
			text += fmt.Sprintf("**%d", power)
		}
	}
	return text
}

// article returns the name of the dimension with its indefinite article.
func (d Dimension) article() string {
	name := d.String()
	switch name[0] {
	case 'a', 'e', 'i', 'o', 'u':
		return "an " + name
	}
	return "a " + name
}
