package recipes

import (
	"github.com/hashicorp/hcl/v2"

	"steelyard/probes/method"
	"steelyard/probes/prior"
)

// Recipe is everything one recipe declares, includes merged in, references
// resolved, defaults filled in and quantities in canonical units.
type Recipe struct {
	File      string   // the recipe, as it was asked for
	Files     []string // the recipe and every file it includes, in the order read
	Object    Object
	Cosmology Cosmology
	Sampling  Sampling
	Nuisances []Nuisance // the recipe's own in the order written, then those of its includes
	Blocks    []Block    // the same
	Reported  []Reported // the same
	Reconcile *Reconcile // nil when nothing is to be compared
}

// Object is what is weighed.
type Object struct {
	Name      string
	Redshift  float64
	HasCentre bool
	RA, Dec   float64 // radians, ICRS
	Range     hcl.Range
}

// Cosmology is a background. Where the recipe gives no omega_lambda, Flat is
// set and OmegaLambda is 1 − OmegaMatter; with a CMB temperature the radiation
// is still to be taken off it.
type Cosmology struct {
	HubbleConstant float64 // km/s/Mpc
	OmegaMatter    float64
	OmegaLambda    float64
	Flat           bool
	W0, Wa         float64
	CMBTemperature float64 // K; 0 leaves photons out
	Range          hcl.Range
}

// Sampling says how many draws are kept of each estimate, and from which seed.
type Sampling struct {
	Draws int
	Seed  int64
	Range hcl.Range // empty when the recipe has no such block
}

// Nuisance is a systematic error that several estimates may share.
type Nuisance struct {
	Name  string
	Prior prior.Prior
	Unit  string // canonical unit of the prior; "" for a pure number
	Range hcl.Range
}

// Block is one probe's data and the estimates to make from them.
type Block struct {
	Probe     string // "xray", "lensing", "dynamics"
	Name      string
	Data      []Data
	Estimates []Estimate
	Range     hcl.Range
}

// Data is one data block: `temperature`, `galaxies`, `bins`.
type Data struct {
	Kind     string
	File     string // as written; "" for a block without a file
	Path     string // File as the program must open it
	Columns  []Column
	Select   *Predicate // nil keeps every row
	Settings method.Settings
	Nested   []Data
	Range    hcl.Range
}

// Column names one column of a data file.
type Column struct {
	Role  string // what it is to the program: "inner", "ra"
	Name  string // what the file calls it
	Unit  string // VOUnits spelling; "" when the recipe leaves it to the file
	Range hcl.Range
}

// Estimate is one estimate to make. Settings holds every setting of its method
// that has a value: its own, else the one given for the whole block, else the
// method's default.
type Estimate struct {
	Name     string
	Method   string
	Settings method.Settings
	Range    hcl.Range
}

// Reported is a mass that someone published.
type Reported struct {
	Name  string
	Probe string // "xray", "lensing", "dynamics", "sz"
	Via   string // how it was made: "hydrostatic", "shear", …
	// Settings holds all its attributes by name: mass, overdensity or radius,
	// projected, concentration, source_redshift, source, probe, via.
	Settings  method.Settings
	Cosmology *Cosmology // the one it was quoted in; nil for the recipe's own
	Range     hcl.Range
}

// Reconcile says which estimates to compare, and where.
type Reconcile struct {
	Estimates []string // full names: "lensing.shapes.nfw", "reported.earlier"
	At        []At
	RadiiFrom string    // full name of an estimate, "own", or "" when not needed
	Limits    []float64 // sigmas at which the verdict changes its word, rising
	Preferred []string  // of estimates made from the same data, those that enter the agreement
	Combined  string    // "linear" or "random-effects": the combined mass that goes into tables
	Range     hcl.Range
}

// At is one radius at which masses are compared.
type At struct {
	Radius float64 // for a fixed radius; 0 for an overdensity
	Unit   string  // of Radius: "kpc" or, where it was given as an angle, "rad"
	Delta  float64 // for an overdensity; 0 for "virial"
	Of     string  // "critical", "mean" or "virial"; "" for a fixed radius
	Text   string  // "overdensity 500", "overdensity 200 mean", "overdensity virial", "radius 1 Mpc"
	Range  hcl.Range
}
