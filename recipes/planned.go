package recipes

// plannedBlocks are the top-level blocks of the language that cannot be read
// yet, with what each is for. A probe that is declared takes precedence.
var plannedBlocks = map[string]string{
	"baryons":  "gas and stars: what can be seen",
	"rotation": "the rotation curve of a galaxy",
	"gravity":  "a law of gravity to test with the visible mass alone",
	"offset":   "gas peaks and mass peaks of a merger",
	"table":    "a table to publish",
	"figure":   "a figure to publish",
	"cohort":   "many objects and a statement about all of them",
	"xray":     "gas in hydrostatic equilibrium",
	"lensing":  "light bent by the mass",
	"dynamics": "motions of galaxies",
}

// plannedMethods are the methods of the language that are not built yet, by
// probe. A declared method of the same name takes precedence.
var plannedMethods = map[string][]string{
	"xray":     {"isothermal-beta", "forward", "backward", "proxy"},
	"lensing":  {"tangential-shear", "aperture", "einstein-radius", "image-positions", "combined"},
	"dynamics": {"virial", "projected-mass", "dispersion-scaling", "jeans", "caustic", "half-light"},
}

// plannedData are the data blocks of the language that are not built yet.
var plannedData = map[string][]string{
	"xray":     {"density", "surface_brightness", "temperature"},
	"lensing":  {"galaxies", "bins", "profile", "images"},
	"dynamics": {"galaxies", "members", "dispersion"},
}
