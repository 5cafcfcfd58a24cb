package units

import "math/big"

// entry is one unit: its size in base units and its dimension. Prefix says
// whether the prefixes of the SI go with it.
type entry struct {
	name   string // as VOUnits spells it
	size   *big.Rat
	dim    Dimension
	prefix bool
}

// Sizes. Exact unless said otherwise; decimals as published.
var (
	one = big.NewRat(1, 1)

	// π to 60 digits: relative error below 1e-59, far below float64.
	pi = decimal("3.14159265358979323846264338327950288419716939937510582097494")

	degree = times(pi, big.NewRat(1, 180))
	minute = times(degree, big.NewRat(1, 60))
	second = times(degree, big.NewRat(1, 3600))

	day        = decimal("86400")
	julianYear = decimal("31557600") // 365.25 days

	astronomicalUnit = decimal("149597870700")                                  // IAU 2012 Resolution B2
	parsec           = quotient(times(decimal("648000"), astronomicalUnit), pi) // IAU 2015 Resolution B2
	lightYear        = times(decimal("299792458"), julianYear)
	solarRadius      = decimal("6.957e8")      // nominal, IAU 2015 Resolution B3
	solarLuminosity  = decimal("3.828e26")     // nominal, IAU 2015 Resolution B3
	solarParameter   = decimal("1.3271244e20") // GM_sun, nominal, IAU 2015 Resolution B3
	newton           = decimal("6.67430e-11")  // CODATA 2018, relative uncertainty 2.2e-5
	solarMass        = quotient(solarParameter, newton)

	electronvolt = decimal("1.602176634e-19")     // SI 2019
	rydberg      = decimal("2.1798723611035e-18") // CODATA 2018, J
	dalton       = decimal("1.66053906660e-27")   // CODATA 2018, kg
)

// known lists the units of the IVOA VOUnits recommendation that measure something
// this program reads, and two that it lacks.
var known = []entry{
	{"m", one, Dimension{length: 1}, true},
	{"g", decimal("1e-3"), Dimension{mass: 1}, true},
	{"s", one, Dimension{time: 1}, true},
	{"rad", one, Dimension{angle: 1}, true},
	{"sr", one, Dimension{angle: 2}, true},
	{"K", one, Dimension{temperature: 1}, true},

	{"Angstrom", decimal("1e-10"), Dimension{length: 1}, false},
	{"AU", astronomicalUnit, Dimension{length: 1}, false},
	{"pc", parsec, Dimension{length: 1}, true},
	{"lyr", lightYear, Dimension{length: 1}, true},
	{"solRad", solarRadius, Dimension{length: 1}, true},
	{"barn", decimal("1e-28"), Dimension{length: 2}, true},

	{"solMass", solarMass, Dimension{mass: 1}, true},
	{"u", dalton, Dimension{mass: 1}, true},

	{"min", decimal("60"), Dimension{time: 1}, true},
	{"h", decimal("3600"), Dimension{time: 1}, true},
	{"d", day, Dimension{time: 1}, true},
	{"yr", julianYear, Dimension{time: 1}, true},
	{"a", julianYear, Dimension{time: 1}, true},

	{"deg", degree, Dimension{angle: 1}, true},
	{"arcmin", minute, Dimension{angle: 1}, true},
	{"arcsec", second, Dimension{angle: 1}, true},
	{"mas", times(second, decimal("1e-3")), Dimension{angle: 1}, false},
	{"hourangle", times(degree, decimal("15")), Dimension{angle: 1}, false}, // not in VOUnits: right ascension in hours

	{"Hz", one, Dimension{time: -1}, true},
	{"N", one, Dimension{mass: 1, length: 1, time: -2}, true},
	{"Pa", one, Dimension{mass: 1, length: -1, time: -2}, true},
	{"dyn", decimal("1e-5"), Dimension{mass: 1, length: 1, time: -2}, false}, // not in VOUnits: CGS
	{"J", one, dimensions["energy"], true},
	{"erg", decimal("1e-7"), dimensions["energy"], true},
	{"eV", electronvolt, dimensions["energy"], true},
	{"Ry", rydberg, dimensions["energy"], true},
	{"W", one, dimensions["luminosity"], true},
	{"solLum", solarLuminosity, dimensions["luminosity"], true},
	{"Jy", decimal("1e-26"), Dimension{mass: 1, time: -2}, true},

	{"count", one, Dimension{count: 1}, true},
	{"photon", one, Dimension{photon: 1}, true},
	{"mag", one, Dimension{magnitude: 1}, true},
	{"%", decimal("0.01"), Dimension{}, false},
}

// alias gives other spellings that tables use.
var alias = map[string]string{
	"angstrom": "Angstrom", "Å": "Angstrom",
	"au": "AU", "ct": "count", "counts": "count", "ph": "photon",
	"Msun": "solMass", "M_sun": "solMass", "Msol": "solMass", "M_solar": "solMass", "M☉": "solMass", "M⊙": "solMass",
	"Lsun": "solLum", "L_sun": "solLum", "Lsol": "solLum", "L☉": "solLum", "L⊙": "solLum",
	"Rsun": "solRad", "R_sun": "solRad", "Rsol": "solRad", "R☉": "solRad", "R⊙": "solRad",
	"dyne": "dyn",
}

// hubble explains why h is refused wherever it is not plainly the hour.
const hubble = "h is the hour in VOUnits and the Hubble constant in many papers: divide it out with the H0 the number was quoted for, and name the plain unit"

// refused gives the reason for spellings that are understood and not accepted.
var refused = map[string]string{
	"'":    "write arcmin for minutes of arc",
	"′":    "write arcmin for minutes of arc",
	"\"":   "write arcsec for seconds of arc",
	"″":    "write arcsec for seconds of arc",
	"°":    "write deg for degrees",
	"[":    "square brackets mean a logarithm: give the plain quantity, not its logarithm",
	"log":  "a logarithm has no unit that can be converted: give the plain quantity",
	"ln":   "a logarithm has no unit that can be converted: give the plain quantity",
	"exp":  "only plain products and quotients of units are read",
	"sqrt": "only whole powers of units are read",
	"dex":  "a dex is a step in a logarithm: give the plain quantity",
	"pct":  "write % for percent",
}

func init() {
	const reason = "nothing that is read here is measured in it"
	for _, name := range []string{"A", "C", "F", "G", "H", "Ohm", "S", "T", "V", "Wb", "D", "cd", "lm", "lx", "mol",
		"R", "adu", "electron", "beam", "bin", "bit", "byte", "B", "chan", "dB", "pix", "pixel", "voxel", "Ba", "Sun"} {
		refused[name] = reason
	}
}

// prefixes of the SI, longest first where one begins another.
var prefixes = []struct {
	name  string
	power int
}{
	{"da", 1}, {"y", -24}, {"z", -21}, {"a", -18}, {"f", -15}, {"p", -12}, {"n", -9}, {"u", -6}, {"µ", -6}, {"μ", -6},
	{"m", -3}, {"c", -2}, {"d", -1}, {"h", 2}, {"k", 3}, {"M", 6}, {"G", 9}, {"T", 12}, {"P", 15}, {"E", 18}, {"Z", 21}, {"Y", 24},
}

var byName = func() map[string]entry {
	m := make(map[string]entry)
	for _, e := range known {
		m[e.name] = e
	}
	for other, name := range alias {
		m[other] = m[name]
	}
	return m
}()

// lookup finds a unit by its symbol, alone or with a prefix, and returns it
// under the name VOUnits gives it.
func lookup(symbol string) (entry, bool) {
	if e, ok := byName[symbol]; ok {
		return e, true
	}
	for _, p := range prefixes {
		if len(symbol) <= len(p.name) || symbol[:len(p.name)] != p.name {
			continue
		}
		e, ok := byName[symbol[len(p.name):]]
		if !ok || !e.prefix {
			continue
		}
		name := p.name
		if p.power == -6 {
			name = "u"
		}
		return entry{name + e.name, times(e.size, powerOfTen(p.power)), e.dim, false}, true
	}
	return entry{}, false
}

func times(a, b *big.Rat) *big.Rat    { return new(big.Rat).Mul(a, b) }
func quotient(a, b *big.Rat) *big.Rat { return new(big.Rat).Quo(a, b) }

// decimal reads a constant of this table; it panics on a misprint.
func decimal(text string) *big.Rat {
	r, ok := new(big.Rat).SetString(text)
	if !ok {
		panic("units: " + text + " is not a decimal")
	}
	return r
}

// powerOfTen returns 10**n exactly.
func powerOfTen(n int) *big.Rat {
	if n < 0 {
		return new(big.Rat).Inv(powerOfTen(-n))
	}
	return new(big.Rat).SetInt(new(big.Int).Exp(big.NewInt(10), big.NewInt(int64(n)), nil))
}
