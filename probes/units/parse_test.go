package units

import (
	"errors"
	"math/big"
	"strings"
	"testing"
)

func TestRefusesUnits(t *testing.T) {
	for _, c := range []struct {
		text   string
		offset int
		reason string // a part of the message
	}{
		{"kpcc", 0, `did you mean "kpc"`},
		{"km/sec", 3, `did you mean "s"`},
		{"Arcmin", 0, `did you mean "arcmin"`},
		{"degrees", 0, `did you mean "deg"`},
		{"blorp", 0, "is not known"},
		{"h-1 Mpc", 0, "Hubble constant"},
		{"Mpc/h", 4, "Hubble constant"},
		{"10**14 Msun.h-1", 12, "Hubble constant"},
		{"h70-1 kpc", 0, "Hubble constant"},
		{"[Msun]", 0, "logarithm"},
		{"log(Msun)", 0, "logarithm"},
		{"dex", 0, "logarithm"},
		{"sqrt(m)", 0, "whole powers"},
		{"m**(1/2)", 1, "whole powers"},
		{"m**0.5", 1, "whole powers"},
		{"'furlong'", 0, "in quotes"},
		{"'", 0, "write arcmin"},
		{"\"", 0, "write arcsec"},
		{"°", 0, "write deg"},
		{"pct", 0, "write %"},
		{"%.kpc", 0, "stands alone"},
		{"cd", 0, "nothing that is read here"},
		{"J/s.m", 3, "ambiguous"},
		{"km/s Mpc", 5, "ambiguous"},
		{"m..s", 2, "a unit was expected"},
		{"km/s/", 5, "missing at the end"},
		{"*m", 0, "cannot begin"},
		{"m **2", 2, "right behind"},
		{"m**", 1, "whole number"},
		{"km-s", 2, "whole number"},
		{"(m", 0, "not closed"},
		{"m)", 1, "not expected"},
		{"()", 1, "expected in the parentheses"},
		{"-3 m", 0, "a unit was expected"},
		{"0 m", 0, "must be positive"},
		{"m**25", 0, "beyond 24"},
		{"(m**5)**5", 0, "beyond 24"},
		{"m**20.m**20", 0, "beyond 24"},
		{"m**99999999999999999999", 3, "too large"},
		{"(m**24)**9223372036854775807", 9, "too large"},
		{"10**400000 m", 4, "too large"},
		{"20000000E000400 m", 0, "beyond what a number can hold"},
		{"1e999999999 m", 0, "beyond what a number can hold"},
		{"barn**24.J**24.solLum**24", 0, "no quantity has"},
		{strings.Repeat("m.", 200), 0, "more than 200"},
		{strings.Repeat("(", 150), 150, "expected in the parentheses"},
	} {
		u, err := Parse(c.text)
		var e *Error
		if !errors.As(err, &e) {
			t.Errorf("%q was read as %q, %v", c.text, u, err)
			continue
		}
		if e.Offset != c.offset || !strings.Contains(e.Reason, c.reason) {
			t.Errorf("%q: at %d %q, want at %d something about %q", c.text, e.Offset, e.Reason, c.offset, c.reason)
		}
	}
}

func TestFactorRefusesOtherDimensions(t *testing.T) {
	for _, c := range []struct{ from, to, want string }{
		{"arcmin", "kpc", "arcmin cannot be converted to kpc: an angle is not a length"},
		{"", "keV", "a number without a unit cannot be converted to keV: a pure number is not an energy"},
		{"K", "keV", "X-ray temperatures are given as kT"},
		{"photon", "count", "a number of photons is not a number of counts"},
	} {
		if _, err := Factor(MustParse(c.from), MustParse(c.to)); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s to %s: %v, want %s", c.from, c.to, err, c.want)
		}
	}
}

func TestSuggest(t *testing.T) {
	for text, want := range map[string]string{
		"KPC": "kpc", "kpcs": "kpc", "kev": "keV", "MSUN": "solMass", "solmass": "solMass", "msolar": "solMass", "M_SUN": "solMass",
		"arcminutes": "arcmin", "arcsecs": "arcsec", "arscec": "arcsec", "kiloparsec": "kpc", "Degrees": "deg", "kms": "km/s",
		"percent": "%", "megaparsecs": "Mpc", "solLumm": "solLum", "zzz": "", "": "", "q": "", "flux": "",
	} {
		if got := Suggest(text); got != want {
			t.Errorf("%q: %q is suggested, want %q", text, got, want)
		}
	}
}

// Whatever is read is spelt so that it reads back as the same unit.
func FuzzParse(f *testing.F) {
	for _, seed := range []string{"", "km/s/Mpc", "10+14Msun", "erg / (s cm2)", "1.5x10+11m", "(m/s)**-2", "10**(-4) µarcsec", "%", "h", "---", "1e-7 J", "[Msun]", "m^-3", "'a'", "Mpc/h"} {
		f.Add(seed)
	}
	f.Fuzz(func(t *testing.T, text string) {
		u, err := Parse(text)
		if err != nil {
			var e *Error
			if !errors.As(err, &e) || e.Offset < 0 || e.Offset > len(text) || e.Reason == "" {
				t.Fatalf("%q: %#v", text, err)
			}
			return
		}
		again, err := Parse(u.String())
		if err != nil || again.dim != u.dim || again.size().Cmp(u.size()) != 0 || again.String() != u.String() {
			t.Fatalf("%q is spelt %q, which reads as %q (%v)", text, u, again, err)
		}
		if one, err := Factor(u, again); err != nil || one.Cmp(big.NewRat(1, 1)) != 0 {
			t.Fatalf("%q to itself: %v, %v", text, one, err)
		}
	})
}
