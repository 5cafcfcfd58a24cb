// Package weighing is the result of weighing one object: its types, its JSON
// and its text for a terminal. It computes nothing.
package weighing

import (
	"encoding/json"
	"io"
)

// Schema names the form of the JSON.
const Schema = "steelyard/weighing/1"

// Interval is a median with the 16th and 84th percentile.
type Interval struct {
	Median float64 `json:"median"`
	Lo     float64 `json:"lo"`
	Hi     float64 `json:"hi"`
}

// Weighing is everything that was found out about one object. Masses in Msun,
// lengths in physical kpc.
type Weighing struct {
	Schema      string        `json:"schema"`
	Recipe      string        `json:"-"` // as it was asked for
	Object      Object        `json:"object"`
	Cosmology   Cosmology     `json:"cosmology"`
	Estimates   []Estimate    `json:"estimates"`
	Tensions    []Tension     `json:"tensions,omitempty"`
	Profiles    []Profile     `json:"profile_tensions,omitempty"`
	Spreads     []Spread      `json:"method_spread,omitempty"`
	Consistency []Consistency `json:"consistency,omitempty"`
	Combined    []Combined    `json:"combined,omitempty"`
	CombinedBy  string        `json:"combined_by,omitempty"` // what goes into tables: "linear" or "random-effects"
	Whole       *Whole        `json:"combined_profile,omitempty"`
	Levers      []Lever       `json:"levers,omitempty"`
	Sensitivity []Sensitivity `json:"sensitivity,omitempty"`
	Warnings    []string      `json:"warnings,omitempty"` // of the comparison
	Failures    []Failure     `json:"failures,omitempty"`
	Nodes       []Node        `json:"nodes"`
	RadiiFrom   string        `json:"-"` // whose radii are matched, "own", or ""
}

// Object is what was weighed.
type Object struct {
	Name     string  `json:"name"`
	Redshift float64 `json:"redshift"`
}

// Cosmology is the background of every estimate.
type Cosmology struct {
	HubbleConstant float64  `json:"hubble_constant"`
	OmegaMatter    float64  `json:"omega_matter"`
	OmegaLambda    float64  `json:"omega_lambda"`
	W0             *float64 `json:"w0,omitempty"`
	Wa             *float64 `json:"wa,omitempty"`
	CMBTemperature *float64 `json:"cmb_temperature,omitempty"`
}

// Estimate is one mass estimate.
type Estimate struct {
	Name       string              `json:"name"`
	Probe      string              `json:"probe"`
	Method     string              `json:"method"`
	Draws      int                 `json:"draws"`
	Covers     [2]float64          `json:"covers_kpc"`
	Parameters map[string]Interval `json:"parameters"`
	Own        []Own               `json:"own"`
	At         []At                `json:"at,omitempty"`
	Quality    Quality             `json:"quality"`
	Checks     []Check             `json:"checks"`
	Assumes    []string            `json:"assumes"`
	Warnings   []string            `json:"warnings"`
}

// Own is a mass inside the estimate's own radius of an overdensity.
type Own struct {
	Overdensity  float64  `json:"overdensity"` // the number; for "virial" that of Bryan & Norman 1998
	Of           string   `json:"of"`          // "critical", "mean" or "virial"
	Radius       Interval `json:"radius_kpc"`
	Mass         Interval `json:"mass"`
	Extrapolated bool     `json:"extrapolated"`
}

// At is a mass at a place where estimates are compared.
type At struct {
	At           string   `json:"at"`
	Radius       float64  `json:"radius_kpc"`
	Mass         Interval `json:"mass"`
	LnMean       float64  `json:"ln_mean"`
	LnSD         float64  `json:"ln_sd"`
	Extrapolated bool     `json:"extrapolated"`
}

// Quality says how far the draws of an estimate can be trusted.
type Quality struct {
	Converged      bool    `json:"converged"`
	Sampler        string  `json:"sampler"`
	EffectiveDraws float64 `json:"effective_draws"`
	TailShape      float64 `json:"tail_shape"`
	Chi2           float64 `json:"chi2"`
	Dof            int     `json:"dof"`
}

// Check is one test of the data or the fit.
type Check struct {
	Name      string   `json:"name"`
	Statistic float64  `json:"statistic"`
	PValue    *float64 `json:"p_value,omitempty"` // absent where the check has none
	Passed    bool     `json:"passed"`
	Note      string   `json:"note,omitempty"`
}

// Failure is a node that could not be computed.
type Failure struct {
	Node   string `json:"node"`
	Where  string `json:"where"`
	Reason string `json:"reason"`
}

// Node is one step of the work.
type Node struct {
	ID      string  `json:"id"`
	Kind    string  `json:"kind"`
	State   string  `json:"state,omitempty"`
	Digest  string  `json:"digest,omitempty"`
	Seconds float64 `json:"seconds"`
}

// WriteJSON writes the weighing as one line.
func (w *Weighing) WriteJSON(out io.Writer) error {
	return json.NewEncoder(out).Encode(w)
}

// Record is the weighing as the history keeps it: the JSON without the nodes'
// states and durations, so that two runs that found the same are the same.
func (w *Weighing) Record() ([]byte, error) {
	kept := *w
	kept.Nodes = make([]Node, len(w.Nodes))
	for i, n := range w.Nodes {
		kept.Nodes[i] = Node{ID: n.ID, Kind: n.Kind, Digest: n.Digest}
	}
	return json.Marshal(&kept)
}
