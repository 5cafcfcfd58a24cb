package weighing

// Tension is the ratio of two estimates of independent data at one place.
type Tension struct {
	At      string   `json:"at"`
	A       string   `json:"a"`
	B       string   `json:"b"`
	Radii   string   `json:"radii"` // "matched" or "own"
	Ratio   Interval `json:"ratio"`
	Sigma   float64  `json:"sigma"`
	Tail    bool     `json:"tail,omitempty"`
	PValue  float64  `json:"p_value"`
	PFamily float64  `json:"p_family"`
	// RadiusLn is by how much ln ratio changes when the matched radius moves by
	// its own error.
	RadiusLn float64  `json:"radius_choice_ln,omitempty"`
	Doubtful []string `json:"doubtful,omitempty"` // why not to believe it
}

// Profile is the difference of two estimates at several radii at once.
type Profile struct {
	A      string   `json:"a"`
	B      string   `json:"b"`
	At     []string `json:"at"`
	Kept   int      `json:"directions"` // independent ones among the radii
	Sigma  float64  `json:"sigma"`
	Tail   bool     `json:"tail,omitempty"`
	PValue float64  `json:"p_value"`
}

// Spread is the ratio of two estimates made from the same data: a difference of
// methods, without a significance.
type Spread struct {
	At    string  `json:"at"`
	A     string  `json:"a"`
	B     string  `json:"b"`
	Ratio float64 `json:"ratio"`
}

// Consistency is the agreement of all compared estimates at one place.
type Consistency struct {
	At       string             `json:"at"`
	Chi2     float64            `json:"chi2"`
	Dof      int                `json:"dof"`
	PValue   float64            `json:"p_value"`
	Sigma    float64            `json:"sigma"`
	Tail     bool               `json:"tail,omitempty"`
	Verdict  string             `json:"verdict"`
	Of       []string           `json:"of"`
	Without  map[string]float64 `json:"sigma_without,omitempty"` // each of Of left out
	Evidence *Evidence          `json:"evidence,omitempty"`
	Given    []string           `json:"given,omitempty"` // what the verdict is conditional on
	Doubtful []string           `json:"doubtful,omitempty"`
}

// Evidence is that of one common mass against separate masses.
type Evidence struct {
	LnBayes float64 `json:"ln_bayes_factor"`
	Prior   string  `json:"prior"` // of the separate masses
}

// Combined is the mass that all independent estimates give at one place.
type Combined struct {
	At        string             `json:"at"`
	Mass      Interval           `json:"mass"` // the best linear one
	ScatterLn float64            `json:"extra_scatter_ln"`
	Weights   map[string]float64 `json:"weights"`
	// Scattered is the combination that allows for the extra scatter; absent where
	// there is none.
	Scattered *Scattered `json:"random_effects,omitempty"`
}

// Scattered is a combined mass with scatter beyond the errors.
type Scattered struct {
	Mass    Interval           `json:"mass"`
	Weights map[string]float64 `json:"weights"`
}

// Whole is the combined profile inside its own radii.
type Whole struct {
	Own       []Own `json:"own"`
	Scattered []Own `json:"random_effects,omitempty"`
}

// Lever is what one assumption would have to be to bring the worst pair to one
// sigma. Value is absent where it cannot.
type Lever struct {
	At         string   `json:"at"`
	A          string   `json:"a"`
	B          string   `json:"b"`
	Assumption string   `json:"assumption"`
	Unit       string   `json:"unit,omitempty"`
	Present    float64  `json:"value_now"`
	Value      *float64 `json:"value_needed,omitempty"`
	InPriorSD  *float64 `json:"in_prior_sd,omitempty"` // absent for an exact number
	// Sigma, All and Chi2 are the pair's, that of all and the change of the
	// estimates' own χ², with the assumption there.
	Sigma        *float64 `json:"sigma_then,omitempty"`
	All          *float64 `json:"sigma_of_all_then,omitempty"`
	Chi2         *float64 `json:"chi2_change,omitempty"`
	Interpolated bool     `json:"interpolated,omitempty"` // between trials, not run itself
	Cannot       string   `json:"cannot,omitempty"`       // why it cannot do it
}

// Sensitivity is how the mass of an estimate changes with less of its data.
type Sensitivity struct {
	Estimate string   `json:"estimate"`
	Change   string   `json:"change"` // "without the innermost bin"
	At       string   `json:"at"`
	Radius   float64  `json:"radius_kpc"`
	Mass     Interval `json:"mass"`      // with less data
	LnChange float64  `json:"ln_change"` // of its median
	InSD     float64  `json:"in_sd"`     // the same, in standard deviations of the mass with all data
}
