// Package constants holds the physical constants of the whole program, one
// table, each with its source.
//
// Working units everywhere inside the program are kpc (physical), Msun, km/s,
// keV, cm⁻³ and radians; the derived values below are in those units.
//
// Sources: CODATA 2018 (Tiesinga et al. 2021, Rev. Mod. Phys. 93, 025010) for
// G, m_p, e and c; IAU 2015 Resolution B3 for the nominal solar mass parameter;
// IAU 2015 Resolution B2 and 2012 Resolution B2 for the parsec and the
// astronomical unit.
package constants

import "math"

const (
	// SpeedOfLight is c in km/s, exact (SI definition).
	SpeedOfLight = 299792.458

	// NewtonSI is G in m³ kg⁻¹ s⁻², relative uncertainty 2.2e-5 (CODATA 2018).
	NewtonSI = 6.67430e-11
	// SolarMassParameterSI is GM_sun in m³ s⁻², nominal and exact (IAU 2015 B3).
	SolarMassParameterSI = 1.3271244e20
	// SolarMassKilogram is GM_sun/G in kg.
	SolarMassKilogram = SolarMassParameterSI / NewtonSI
	// AstronomicalUnitMetre is exact (IAU 2012 B2).
	AstronomicalUnitMetre = 149597870700.0
	// ParsecMetre is 648000/π au, exact (IAU 2015 B2).
	ParsecMetre = 648000 / math.Pi * AstronomicalUnitMetre
	// ProtonMassKilogram is m_p, relative uncertainty 3.1e-10 (CODATA 2018).
	ProtonMassKilogram = 1.67262192369e-27
	// KiloelectronvoltJoule is 1 keV in J, exact (SI definition of e).
	KiloelectronvoltJoule = 1.602176634e-16
	// StefanBoltzmannSI is σ_SB in W m⁻² K⁻⁴, exact (SI definitions), to ten digits.
	StefanBoltzmannSI = 5.670374419e-8
	// JulianYearSecond is the Julian year of 365.25 days in s, exact.
	JulianYearSecond = 31557600.0

	// KiloparsecMetre is 1 kpc in m.
	KiloparsecMetre = 1e3 * ParsecMetre
	// G is Newton's constant in kpc (km/s)² Msun⁻¹. GM_sun is known better
	// than G, so this carries no uncertainty of G itself.
	G = SolarMassParameterSI / KiloparsecMetre / 1e6
	// LensingMass is c²/(4πG) in Msun/kpc.
	LensingMass = SpeedOfLight * SpeedOfLight / (4 * math.Pi * G)
	// HydrostaticMass is 1 keV kpc/(G m_p) in Msun: the mass of hydrostatic
	// equilibrium per keV, kpc and unit logarithmic slope for μ = 1.
	HydrostaticMass = KiloelectronvoltJoule * KiloparsecMetre / (NewtonSI * ProtonMassKilogram * SolarMassKilogram)
	// ProtonMassPerCubicKpc is the mass in Msun of one proton per cm³ filling a
	// cubic kpc.
	ProtonMassPerCubicKpc = ProtonMassKilogram * 1e6 * KiloparsecMetre * KiloparsecMetre * KiloparsecMetre / SolarMassKilogram
	// SecondsPerHubble converts 1/(km/s/Mpc) to s.
	SecondsPerHubble = 1e3 * KiloparsecMetre / 1e3
	// Gigayear is 1e9 Julian years in s.
	Gigayear = 1e9 * JulianYearSecond
)
