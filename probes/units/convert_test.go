package units

import (
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"strconv"
	"testing"
)

// Decimals are exact until they are rounded once; the wanted numbers are what
// the Go compiler, exact too, makes of the same decimals.
func TestDecimalRoundsOnce(t *testing.T) {
	for _, c := range []struct {
		text, from, to string
		want           float64
	}{
		{"1.001", "Mpc", "kpc", 1001},
		{"70", "km/s/Mpc", "km.s**-1.Mpc**-1", 70},
		{"0.1", "Mpc", "kpc", 100},
		{"4.35", "keV", "eV", 4350},
		{"1.15", "arcmin", "arcsec", 69},
		{"-2.3e-3", "cm-3", "m-3", -2300},
		{"1", "erg", "keV", 1e-7 / 1.602176634e-16},
		{"180", "deg", "rad", math.Pi},
		{"1", "arcmin", "rad", math.Pi / 10800},
		{"-0.0", "Mpc", "kpc", 0},
		{"+5.", "", "%", 500},
	} {
		from, to := MustParse(c.from), MustParse(c.to)
		got, err := Decimal(c.text, from, to)
		converter, cerr := NewConverter(from, to)
		if cerr != nil {
			t.Fatal(cerr)
		}
		fast, ferr := converter.Decimal(c.text)
		if err != nil || ferr != nil || got != c.want || fast != c.want || math.Signbit(fast) && fast == 0 {
			t.Errorf("%s %s is %v and %v %s (%v, %v), want %v", c.text, c.from, got, fast, c.to, err, ferr, c.want)
		}
	}
}

func TestRefusesNumbers(t *testing.T) {
	for _, same := range []bool{true, false} {
		to := "Mpc"
		if !same {
			to = "kpc"
		}
		c, err := NewConverter(MustParse("Mpc"), MustParse(to))
		if err != nil {
			t.Fatal(err)
		}
		for text, want := range map[string]error{
			"": ErrNotNumber, "-": ErrNotNumber, "abc": ErrNotNumber, "1 2": ErrNotNumber, "0x10": ErrNotNumber, "1_0": ErrNotNumber,
			"nan": ErrNotNumber, "Inf": ErrNotNumber, "1e": ErrNotNumber, "--1": ErrNotNumber, ".": ErrNotNumber, "1.2.3": ErrNotNumber,
			"1e310": ErrRange, "-1e-350": ErrRange, "123456789012345678901e300": ErrRange, "1/2": ErrNotNumber,
		} {
			if x, err := c.Decimal(text); !errors.Is(err, want) {
				t.Errorf("%q gives %v, %v", text, x, err)
			}
			if x, err := Decimal(text, MustParse("Mpc"), MustParse(to)); !errors.Is(err, want) {
				t.Errorf("%q gives %v, %v", text, x, err)
			}
		}
		for _, x := range []float64{math.NaN(), math.Inf(1), math.Inf(-1)} {
			if y, err := c.Float(x); !errors.Is(err, ErrNotFinite) {
				t.Errorf("%v gives %v, %v", x, y, err)
			}
			if y, err := c.Shortest(x); !errors.Is(err, ErrNotFinite) {
				t.Errorf("%v gives %v, %v", x, y, err)
			}
		}
		if _, err := c.Decimal("1e99999999999"); !errors.Is(err, ErrRange) {
			t.Errorf("a huge exponent: %v", err)
		}
	}
	if _, err := Convert(1e308, MustParse("Mpc"), MustParse("m")); !errors.Is(err, ErrRange) {
		t.Errorf("1e308 Mpc in m: %v", err)
	}
}

// The quick Converter gives the digits of exact arithmetic, always.
func TestConverterAgainstExactArithmetic(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	for _, pair := range [][2]string{
		{"deg", "rad"}, {"Mpc", "kpc"}, {"arcmin", "rad"}, {"keV", "erg"}, {"kpc", "Mpc"}, {"10**14solMass", "kg"}, {"cm-3", "kpc-3"}, {"s", "s"}, {"Hz", "km/s/Mpc"},
	} {
		from, to := MustParse(pair[0]), MustParse(pair[1])
		c, err := NewConverter(from, to)
		if err != nil {
			t.Fatal(err)
		}
		for range 1000 {
			x := (rng.Float64() - 0.5) * math.Pow(10, float64(rng.IntN(80)-40))
			text := strconv.FormatFloat(x, 'g', 1+rng.IntN(20), 64)
			for _, got := range []struct {
				name      string
				fast, ref func() (float64, error)
			}{
				{"Decimal", func() (float64, error) { return c.Decimal(text) }, func() (float64, error) { return Decimal(text, from, to) }},
				{"Float", func() (float64, error) { return c.Float(x) }, func() (float64, error) { return Convert(x, from, to) }},
				{"Shortest", func() (float64, error) { return c.Shortest(x) }, func() (float64, error) { return Decimal(fmt.Sprint(x), from, to) }},
			} {
				fast, err := got.fast()
				ref, rerr := got.ref()
				if err != nil || rerr != nil || fast != ref {
					t.Fatalf("%s of %s (%v) %s is %v %s (%v), exactly %v (%v)", got.name, text, x, from, fast, to, err, ref, rerr)
				}
			}
		}
	}
}

// Products exactly in the middle of two float64 go to the even one: with
// n = 2**53+1 the product n × 1 is such a middle, and so is any n × 2**k.
func TestConverterBreaksTiesToEven(t *testing.T) {
	c, err := NewConverter(MustParse("2 m"), MustParse("m"))
	if err != nil {
		t.Fatal(err)
	}
	for text, want := range map[string]float64{"9007199254740993": 1 << 54, "9007199254740995": 1<<54 + 8} {
		if got, err := c.Decimal(text); err != nil || got != want {
			t.Errorf("2 × %s is %v (%v), want %v", text, got, err, want)
		}
	}
}

func FuzzConverter(f *testing.F) {
	for _, seed := range []string{"1.001", "-0", "1e-300", "9007199254740993", "5.", ".5", "1e60", "00000000000000000000000000000012", "+1.0e+05"} {
		f.Add(seed)
	}
	from, to := MustParse("deg"), MustParse("rad")
	f.Fuzz(func(t *testing.T, text string) {
		c, err := NewConverter(from, to)
		if err != nil {
			t.Fatal(err)
		}
		fast, ferr := c.Decimal(text)
		ref, rerr := Decimal(text, from, to)
		if (ferr == nil) != (rerr == nil) || fast != ref {
			t.Fatalf("%q is %v (%v), exactly %v (%v)", text, fast, ferr, ref, rerr)
		}
	})
}

func BenchmarkConverterDecimal(b *testing.B) {
	c, _ := NewConverter(MustParse("deg"), MustParse("rad"))
	for b.Loop() {
		if _, err := c.Decimal("210.258791"); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkConverterShortest(b *testing.B) {
	c, _ := NewConverter(MustParse("deg"), MustParse("rad"))
	for b.Loop() {
		if _, err := c.Shortest(210.25879130000001); err != nil {
			b.Fatal(err)
		}
	}
}
