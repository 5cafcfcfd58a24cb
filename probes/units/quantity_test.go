package units

import (
	"errors"
	"math"
	"strings"
	"testing"
)

// Values follow from the text; every conversion among them is exact.
func TestReadsQuantities(t *testing.T) {
	for _, c := range []struct {
		text, unit         string
		value, minus, plus float64
		hasUnit, twoSided  bool
	}{
		{"0.3", "", 0.3, 0, 0, false, false},
		{"-0.3", "", -0.3, 0, 0, false, false},
		{"+0.3", "", 0.3, 0, 0, false, false},
		{"−2 K", "K", -2, 0, 0, true, false}, // U+2212
		{"70 km/s/Mpc", "km/s/Mpc", 70, 0, 0, true, false},
		{"1.001 Mpc", "kpc", 1001, 0, 0, true, false},
		{"62 deg", "arcmin", 3720, 0, 0, true, false},
		{"18.4 +- 0.6 arcsec", "arcsec", 18.4, 0.6, 0.6, true, false},
		{"18.4+-0.6arcsec", "arcsec", 18.4, 0.6, 0.6, true, false},
		{"18.4 ± 0.6 arcsec", "arcsec", 18.4, 0.6, 0.6, true, false},
		{"18.4 +/- 0.6 arcsec", "arcsec", 18.4, 0.6, 0.6, true, false},
		{"970 +- 30 km/s", "m/s", 970000, 30000, 30000, true, false},
		{"6.1 +0.9 -0.8 10**14 solMass", "10**14solMass", 6.1, 0.8, 0.9, true, true},
		{"6.1 -0.8 +0.9 10**14 solMass", "10**13solMass", 61, 8, 9, true, true},
		{"6.1 +0.9 -0.8 x 10^14 Msun", "10**14solMass", 6.1, 0.8, 0.9, true, true},
		{"6.1 × 10^14 Msun", "10**14solMass", 6.1, 0, 0, true, false},
		{"1.2e-10 m/s**2", "m/s**2", 1.2e-10, 0, 0, true, false},
		{"1E3 pc", "kpc", 1, 0, 0, true, false},
		{".5 Mpc", "kpc", 500, 0, 0, true, false},
		{"5. Mpc", "kpc", 5000, 0, 0, true, false},
		{"45 %", "", 0.45, 0, 0, true, false},
		{"  4 keV ", "eV", 4000, 0, 0, true, false},
		{"2eV", "eV", 2, 0, 0, true, false},
		{"1 cm-3", "m**-3", 1e6, 0, 0, true, false},
	} {
		q, err := ParseQuantity(c.text)
		if err != nil {
			t.Error(err)
			continue
		}
		value, minus, plus, err := q.In(MustParse(c.unit))
		if err != nil || value != c.value || minus != c.minus || plus != c.plus || q.HasUnit != c.hasUnit || q.TwoSided != c.twoSided {
			t.Errorf("%q: %v -%v +%v %s, unit %t, two-sided %t, %v", c.text, value, minus, plus, c.unit, q.HasUnit, q.TwoSided, err)
		}
	}
}

func TestRefusesQuantities(t *testing.T) {
	for _, c := range []struct {
		text   string
		offset int
		reason string
	}{
		{"", 0, "nothing is written"},
		{"   ", 3, "nothing is written"},
		{"kpc", 0, "expected a number"},
		{"~5 kpc", 0, "expected a number"},
		{"nan", 0, "not a finite number"},
		{"-Inf K", 0, "not a finite number"},
		{"0x1F kpc", 1, "not known"},
		{"1,000 kpc", 1, "without \",\""},
		{"1_000 kpc", 1, "without \"_\""},
		{"1e999999999 kpc", 0, "beyond what a number can hold"},
		{"1e-99999999999999999999 kpc", 0, "beyond what a number can hold"},
		{"5 +- -1 K", 5, "without a sign"},
		{"5 +- K", 5, "size of the error"},
		{"5 +- 0 K", 2, "error of zero"},
		{"5 +1 -0 K", 2, "error of zero"},
		{"5 +1 K", 2, "must be followed by the error below"},
		{"5 -1 K", 2, "needs the error above"},
		{"5 +1 --1 K", 6, "without a sign"},
		{"10+14 Msun", 2, "power of ten is written 10**14"},
		{"5 +- nan K", 5, "not a finite number"},
		{"5 kpc +- 1 kpc", 6, "written once"},
		{"5 +- 3% kpc", 6, "stands alone"},
		{"5 Mpcc", 2, `did you mean "Mpc"`},
		{"5 h-1 Mpc", 2, "Hubble constant"},
		{"18.4\"", 4, "write arcsec"},
		{strings.Repeat("1", 500), 0, "more than 400 digits"},
		{strings.Repeat("1", 5000), 0, "far too long"},
	} {
		q, err := ParseQuantity(c.text)
		var e *Error
		if !errors.As(err, &e) {
			t.Errorf("%q was read as %v %s, %v", c.text, q.Value, q.Unit, err)
			continue
		}
		if e.Offset != c.offset || !strings.Contains(e.Reason, c.reason) {
			t.Errorf("%q: at %d %q, want at %d something about %q", c.text, e.Offset, e.Reason, c.offset, c.reason)
		}
	}
}

func TestInRefusesWhatDoubleCannotHold(t *testing.T) {
	for _, text := range []string{"1e300 Mpc", "5 +- 1e-330 Mpc"} {
		q, err := ParseQuantity(text)
		if err != nil {
			t.Fatal(err)
		}
		if _, _, _, err := q.In(MustParse("fm")); text == "1e300 Mpc" && !errors.Is(err, ErrRange) {
			t.Errorf("%s in fm: %v", text, err)
		}
		if _, _, _, err := q.In(MustParse("Gpc")); text != "1e300 Mpc" && !errors.Is(err, ErrRange) {
			t.Errorf("%s in Gpc: %v", text, err)
		}
		if _, _, _, err := q.In(MustParse("keV")); err == nil {
			t.Errorf("%s in keV was accepted", text)
		}
	}
}

func FuzzParseQuantity(f *testing.F) {
	for _, seed := range []string{"0.3", "70 km/s/Mpc", "18.4 +- 0.6 arcsec", "6.1 +0.9 -0.8 10**14 solMass", "6.1 x 10^14 Msun", "-5e-3 ± 1 %", "1e400", "nan", "5 +1", "−2 K", "1.2e-10 m/s**2", "5 +/- 1 1e3 pc"} {
		f.Add(seed)
	}
	f.Fuzz(func(t *testing.T, text string) {
		q, err := ParseQuantity(text)
		if err != nil {
			var e *Error
			if !errors.As(err, &e) || e.Offset < 0 || e.Offset > len(text) || e.Reason == "" {
				t.Fatalf("%q: %#v", text, err)
			}
			return
		}
		if (q.Minus == nil) != (q.Plus == nil) || q.Plus != nil && (q.Plus.Sign() <= 0 || q.Minus.Sign() <= 0) {
			t.Fatalf("%q: errors %v %v", text, q.Minus, q.Plus)
		}
		value, minus, plus, err := q.In(q.Unit)
		if err == nil && (math.IsInf(value, 0) || math.IsNaN(value) || minus < 0 || plus < 0) {
			t.Fatalf("%q: %v %v %v", text, value, minus, plus)
		}
	})
}
