// Package estimate holds what every estimator is given and what it yields: the
// task, the methods and reductions of a probe, and the few steps all estimators
// share: naming the parameters to draw and laying the drawn masses on the grid.
package estimate

import (
	"context"
	"encoding"

	"steelyard/probes/catalogue"
	"steelyard/probes/cosmology"
	"steelyard/probes/infer"
	"steelyard/probes/method"
)

// Version is raised when what this package does for every method would give
// other draws; it enters the key of every estimate.
const Version = 2

// Object is the thing being weighed.
type Object struct {
	Name      string
	Redshift  float64
	RA, Dec   float64 // radians, ICRS
	HasCentre bool
}

// Task is everything one reduction or one estimate may depend on.
type Task struct {
	Name      string // probe.block.estimate, for messages
	Object    Object
	Cosmology *cosmology.Cosmology
	// Settings are the estimate's own, defaults filled in; empty for a reduction.
	Settings method.Settings
	// Blocks are the settings of the data blocks by name ("bins", "members",
	// "profile"); a nested block is "profile.sources". A block that the recipe
	// does not have is absent.
	Blocks map[string]method.Settings
	// Tables are the columns read for a reduction, by block name as in Blocks.
	Tables map[string]*catalogue.Table
	// Reduced are the encoded outputs of the reductions a method Uses, by the
	// reduction's name.
	Reduced  map[string][]byte
	Sampling infer.Options
}

// Reduction turns tables into what a likelihood needs: a binned profile, a list
// of members. It draws nothing unless Random is set.
type Reduction struct {
	Name    string // "profile", "members"
	Version int
	// From names the data blocks it reads; "?" behind a name marks one that may
	// be absent.
	From   []string
	Random bool // uses Sampling.Stream, so the seed enters its key
	Run    func(context.Context, *Task) (encoding.BinaryMarshaler, error)
}

// Method is one estimator.
type Method struct {
	method.Declaration
	// Uses names the reductions it draws on; of these, the ones whose data the
	// recipe does not have are left out of Task.Reduced.
	Uses []string
	Run  func(context.Context, *Task) (*infer.Draws, error)
}

// Probe is one probe's whole contribution to the program.
type Probe struct {
	Name       string
	Doc        string
	Blocks     []method.Block
	Reductions []Reduction
	Methods    []Method
}

// Declare returns the probe as data, for the recipe reader and the manual.
func (p Probe) Declare() method.Probe {
	d := method.Probe{Name: p.Name, Doc: p.Doc, Blocks: p.Blocks}
	for _, m := range p.Methods {
		d.Methods = append(d.Methods, m.Declaration)
	}
	return d
}
