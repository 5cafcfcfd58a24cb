package units

import (
	"strings"

	"github.com/agext/levenshtein"
)

// written lists the units people write, in the order in which ties are decided.
var written = []string{
	"kpc", "Mpc", "pc", "arcmin", "arcsec", "deg", "rad", "mas", "keV", "eV", "erg", "K", "km/s", "cm", "m", "km",
	"solMass", "solLum", "solRad", "yr", "Gyr", "Myr", "s", "count", "photon", "mag", "Jy", "AU", "hourangle", "Hz", "W", "J", "g", "kg", "lyr",
}

// words gives the units for names written out.
var words = map[string]string{
	"kiloparsec": "kpc", "megaparsec": "Mpc", "parsec": "pc",
	"degree": "deg", "arcminute": "arcmin", "arcsecond": "arcsec", "radian": "rad", "amin": "arcmin", "asec": "arcsec",
	"kelvin": "K", "metre": "m", "meter": "m", "micron": "um", "second": "s", "sec": "s", "year": "yr", "hour": "h", "gram": "g",
	"sunmass": "solMass", "solarmass": "solMass", "msolar": "solMass", "solarmasse": "solMass", "solarluminositie": "solLum", "solarluminosity": "solLum",
	"kms": "km/s", "kps": "km/s", "percent": "%",
}

// Suggest returns the known unit nearest to a misspelt one, "" when none is near.
func Suggest(text string) string {
	plain := strings.ToLower(strings.NewReplacer("_", "", " ", "", "-", "").Replace(text))
	if unit, ok := words[plain]; ok {
		return unit
	}
	if unit, ok := words[strings.TrimSuffix(plain, "s")]; ok {
		return unit
	}
	for _, unit := range written {
		if strings.EqualFold(unit, plain) {
			return unit
		}
	}
	for other, unit := range alias {
		if strings.EqualFold(strings.ReplaceAll(other, "_", ""), plain) {
			return unit
		}
	}
	allowed := 1
	if len(text) > 5 {
		allowed = 2
	}
	if len(text) < 3 || len(text) > 20 {
		return ""
	}
	best, least := "", allowed+1
	for _, unit := range written {
		if d := levenshtein.Distance(plain, strings.ToLower(unit), nil); d < least && len(unit) > 2 {
			best, least = unit, d
		}
	}
	return best
}
