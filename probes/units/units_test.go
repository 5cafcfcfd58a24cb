package units

import (
	"encoding/csv"
	"math"
	"math/big"
	"os"
	"path/filepath"
	"strconv"
	"testing"

	"steelyard/probes/constants"
)

// rows reads a table of ../../testdata/units without its header line.
func rows(t *testing.T, name string) [][]string {
	t.Helper()
	f, err := os.Open(filepath.Join("..", "..", "testdata", "units", name))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r := csv.NewReader(f)
	r.Comment = '#'
	all, err := r.ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	if len(all) < 10 {
		t.Fatalf("%s holds only %d rows", name, len(all))
	}
	return all[1:]
}

func near(got, want, relative float64) bool {
	return math.Abs(got-want) <= relative*math.Abs(want)
}

func number(t *testing.T, text string) float64 {
	t.Helper()
	x, err := strconv.ParseFloat(text, 64)
	if err != nil {
		t.Fatal(err)
	}
	return x
}

// Sizes against astropy.units 5.2.1, to the tolerance of each row: 1e-14, since
// astropy multiplies float64 in a few steps of 1.1e-16 each; for Ry what CODATA
// leaves uncertain.
func TestSizesAgainstAstropy(t *testing.T) {
	for _, row := range rows(t, "sizes.csv") {
		from, err := Parse(row[0])
		if err != nil {
			t.Errorf("%s: %v", row[0], err)
			continue
		}
		got, err := Convert(1, from, MustParse(row[1]))
		if want := number(t, row[2]); err != nil || !near(got, want, number(t, row[3])) {
			t.Errorf("one %s is %v %s (%v), astropy says %v", row[0], got, row[1], err, want)
		}
	}
}

// Spellings, and what astropy's VOUnits parser makes of what String writes.
// 1e-14 as above.
func TestSpellsVOUnits(t *testing.T) {
	for _, row := range rows(t, "vounits.csv") {
		u, err := Parse(row[0])
		if err != nil {
			t.Errorf("%s: %v", row[0], err)
			continue
		}
		if u.String() != row[1] {
			t.Errorf("%q is spelt %q, want %q", row[0], u, row[1])
		}
		size, _ := u.size().Float64()
		if want := number(t, row[2]); !near(size, want, 1e-14) {
			t.Errorf("%s has size %v, astropy reads %v", u, size, want)
		}
	}
}

// The sizes typed here and the constants of the program are the same numbers.
// 4e-16: the constants are products of rounded numbers with math.Pi.
func TestAgreesWithConstants(t *testing.T) {
	for _, c := range []struct {
		unit, si string
		want     float64
	}{
		{"kpc", "m", constants.KiloparsecMetre},
		{"AU", "m", constants.AstronomicalUnitMetre},
		{"solMass", "kg", constants.SolarMassKilogram},
		{"keV", "J", constants.KiloelectronvoltJoule},
		{"yr", "s", constants.JulianYearSecond},
		{"Gyr", "s", constants.Gigayear},
		{"(km/s/Mpc)**-1", "s", constants.SecondsPerHubble},
	} {
		if got, err := Convert(1, MustParse(c.unit), MustParse(c.si)); err != nil || !near(got, c.want, 4e-16) {
			t.Errorf("one %s is %v %s (%v), constants has %v", c.unit, got, c.si, err, c.want)
		}
	}
}

// π against Machin's formula (1706) in integers: π = 16 atan(1/5) − 4 atan(1/239).
func TestPiHasSixtyDigits(t *testing.T) {
	scale := new(big.Int).Exp(big.NewInt(10), big.NewInt(80), nil)
	atan := func(n int64) *big.Int {
		sum, term := new(big.Int), new(big.Int).Quo(scale, big.NewInt(n))
		for k := int64(1); term.Sign() != 0; k += 2 {
			part := new(big.Int).Quo(term, big.NewInt(k))
			if k%4 == 3 {
				part.Neg(part)
			}
			sum.Add(sum, part)
			term.Quo(term, big.NewInt(n*n))
		}
		return sum
	}
	machin := new(big.Int).Mul(big.NewInt(16), atan(5))
	machin.Sub(machin, new(big.Int).Mul(big.NewInt(4), atan(239)))
	gap := new(big.Rat).Sub(pi, new(big.Rat).SetFrac(machin, scale))
	if gap.Abs(gap).Cmp(decimal("5e-60")) > 0 {
		t.Errorf("π is off by %s", gap.FloatString(75))
	}
}

// What cancels must cancel exactly, by the definitions of the units.
func TestExactFactors(t *testing.T) {
	for _, c := range []struct{ from, to, want string }{
		{"Mpc", "kpc", "1000"},
		{"km/s", "m/s", "1000"},
		{"deg", "arcmin", "60"},
		{"arcsec", "deg", "1/3600"},
		{"hourangle", "deg", "15"},
		{"km/s/Mpc", "km.s**-1.Mpc**-1", "1"},
		{"km/s/Mpc", "m/s/kpc", "1"},
		{"keV", "erg", "1602176634/1000000000000000000"},
		{"10**14 solMass", "Msun", "100000000000000"},
		{"cm-3", "m**-3", "1000000"},
		{"%", "", "1/100"},
		{"mas", "arcsec", "1/1000"},
		{"Angstrom", "nm", "1/10"},
		{"pc", "AU.rad.arcsec**-1", "1"}, // IAU 2015 Resolution B2: 648000/π au
	} {
		got, err := Factor(MustParse(c.from), MustParse(c.to))
		if err != nil {
			t.Errorf("%s to %s: %v", c.from, c.to, err)
			continue
		}
		want, _ := new(big.Rat).SetString(c.want)
		if got.Cmp(want) != 0 {
			t.Errorf("%s to %s is %s, want %s", c.from, c.to, got.RatString(), want.RatString())
		}
	}
}

func TestDimensions(t *testing.T) {
	for _, c := range []struct {
		unit, name           string
		length, angle, plain bool
	}{
		{"kpc", "length", true, false, false},
		{"arcmin", "angle", false, true, false},
		{"", "pure number", false, false, true},
		{"%", "pure number", false, false, true},
		{"kpc/Mpc", "pure number", false, false, true},
		{"keV", "energy", false, false, false},
		{"erg", "energy", false, false, false},
		{"km/s", "speed", false, false, false},
		{"cm**-3", "number density", false, false, false},
		{"arcmin**2", "solid angle", false, false, false},
		{"solLum", "luminosity", false, false, false},
		{"keV.cm**2", "length**4.mass.time**-2", false, false, false},
	} {
		u := MustParse(c.unit)
		if u.Describe() != c.name || u.IsLength() != c.length || u.IsAngle() != c.angle || u.IsPure() != c.plain {
			t.Errorf("%q: %s, length %t, angle %t, pure %t", c.unit, u.Describe(), u.IsLength(), u.IsAngle(), u.IsPure())
		}
	}
	if !SameDimension(MustParse("solLum"), MustParse("erg/s")) || SameDimension(MustParse("count"), MustParse("photon")) {
		t.Error("solLum is erg/s, a count is not a photon")
	}
	if !Equal(MustParse("km s-1"), MustParse("km/s")) || !Equal(MustParse("km/s"), MustParse("pm/fs")) || Equal(MustParse("kpc"), MustParse("Mpc")) || Equal(MustParse("rad"), MustParse("")) {
		t.Error("Equal compares size and dimension, not spelling")
	}
	var zero Unit
	if !zero.IsPure() || zero.String() != "" {
		t.Error("the zero Unit is the pure number")
	}
}
