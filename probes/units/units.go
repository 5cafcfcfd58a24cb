// Package units reads quantities, numbers with a unit and perhaps an error, and
// converts them exactly.
package units

import (
	"errors"
	"math/big"
)

// Unit is a parsed unit: an exact (or, where π enters, 60-digit) scale to the
// program's base units and the powers of its dimensions.
type Unit struct {
	scale *big.Rat
	dim   Dimension
	text  string
}

// Dimension holds the powers of the base dimensions.
type Dimension [6]int8

// Parse reads a unit as VOUnits, FITS or CDS tables spell it, or with repeated
// slashes ("km/s/Mpc"). The empty string is the pure number.
func Parse(text string) (Unit, error) { return Unit{}, errors.New("units: being written") }

// MustParse is Parse for constants of the program; it panics on an error.
func MustParse(text string) Unit {
	u, err := Parse(text)
	if err != nil {
		panic(err)
	}
	return u
}

// String returns the unit in VOUnits spelling.
func (u Unit) String() string { return u.text }

// SameDimension reports whether quantities of the two units can be compared.
func SameDimension(a, b Unit) bool { return a.dim == b.dim }

// IsLength, IsAngle and IsPure report a unit's dimension.
func (u Unit) IsLength() bool { return false }
func (u Unit) IsAngle() bool  { return false }
func (u Unit) IsPure() bool   { return false }

// Factor returns what a number in unit from is multiplied by to be in unit to.
func Factor(from, to Unit) (*big.Rat, error) { return nil, errors.New("units: being written") }

// Quantity is a number with a unit and perhaps errors, all exact decimals.
type Quantity struct {
	Value    *big.Rat
	Minus    *big.Rat // size of the error below; nil for none
	Plus     *big.Rat // size of the error above; equal to Minus when symmetric; nil for none
	Unit     Unit
	HasUnit  bool // whether the text named a unit at all
	TwoSided bool // written as +a -b
}

// ParseQuantity reads "18.4 +- 0.6 arcsec", "6.1 +0.9 -0.8 10**14 solMass",
// "70 km/s/Mpc", "0.3".
func ParseQuantity(text string) (Quantity, error) {
	return Quantity{}, errors.New("units: being written")
}

// In converts the value and errors to the unit, each multiplied exactly and
// rounded to float64 once; absent errors are 0.
func (q Quantity) In(u Unit) (value, minus, plus float64, err error) {
	return 0, 0, 0, errors.New("units: being written")
}

// Convert multiplies a float64 exactly by the factor from one unit to another
// and rounds once.
func Convert(x float64, from, to Unit) (float64, error) {
	return 0, errors.New("units: being written")
}

// Decimal converts a number written as an exact decimal ("1.001") from one unit
// to another, rounding once.
func Decimal(text string, from, to Unit) (float64, error) {
	return 0, errors.New("units: being written")
}

// Suggest returns the known unit nearest to a misspelt one, "" when none is near.
func Suggest(text string) string { return "" }
