package reconcile

import (
	"fmt"
	"math"

	"steelyard/probes/cosmology"
	"steelyard/probes/halo"
	"steelyard/probes/infer"
)

// Setup says what is compared, and where.
type Setup struct {
	Estimates  []Estimate
	Places     []At
	RadiiFrom  string            // the estimate whose R_Δ is the matched radius, or Own; "" without overdensities
	Preferred  []string          // of estimates made from the same data, those that are evidence; the first of each when silent
	Own        []halo.Definition // overdensities at which the combined profile is read
	Background Background
}

// Estimate is one mass estimate to be compared.
type Estimate struct {
	Name  string // reference in the recipe: "lensing.shapes.nfw"
	Block string // the block whose data it is made from: "lensing.shapes"
	Draws *infer.Draws
	// Tilts are the priors of shared nuisances that these draws were made with in
	// place of the recipe's, to have them where the other estimates put them. Alone
	// then holds the draws under the recipe's own.
	Tilts []Tilt
	Alone *infer.Draws
}

// alone is what the estimate says by itself.
func (e Estimate) alone() *infer.Draws {
	if e.Alone != nil {
		return e.Alone
	}
	return e.Draws
}

// Tilt is a normal prior in the recipe's prior scores of one nuisance.
type Tilt struct {
	Nuisance string
	Mean, SD float64
}

// prior is the prior of a nuisance that the estimate was made with.
func (e Estimate) prior(nuisance string) Tilt {
	for _, t := range e.Tilts {
		if t.Nuisance == nuisance {
			return t
		}
	}
	return Tilt{nuisance, 0, 1}
}

// At is one place where masses are compared: a radius, or an overdensity.
type At struct {
	Radius     float64         // kpc; 0 for an overdensity
	Definition halo.Definition // when Radius is 0
}

// String is the label of the place in text and JSON.
func (a At) String() string {
	switch {
	case a.Radius > 0:
		return fmt.Sprintf("radius %.6g kpc", a.Radius)
	case a.Definition.Of == "virial":
		return "overdensity virial"
	case a.Definition.Of == "mean":
		return fmt.Sprintf("overdensity %g mean", a.Definition.Delta)
	}
	return fmt.Sprintf("overdensity %g", a.Definition.Delta)
}

// Own is RadiiFrom when each estimate is read at its own radius, draw by draw.
const Own = "own"

// Background is what turns an overdensity into a density.
type Background struct {
	Cosmology *cosmology.Cosmology
	Redshift  float64
}

func (b Background) threshold(d halo.Definition) (float64, error) {
	return d.Threshold(b.Cosmology, b.Redshift)
}

// Interval is the 16th, 50th and 84th percentile of a set of draws.
type Interval struct {
	Median float64 `json:"median"`
	Lo     float64 `json:"lo"`
	Hi     float64 `json:"hi"`
}

func interval(values []float64) Interval {
	p := infer.Percentiles(values, 16, 50, 84)
	return Interval{Lo: p[0], Median: p[1], Hi: p[2]}
}

func expInterval(ln []float64) Interval {
	i := interval(ln)
	return Interval{Lo: math.Exp(i.Lo), Median: math.Exp(i.Median), Hi: math.Exp(i.Hi)}
}

func meanSD(x []float64) (mean, sd float64) {
	for _, v := range x {
		mean += v
	}
	mean /= float64(len(x))
	for _, v := range x {
		sd += (v - mean) * (v - mean)
	}
	return mean, math.Sqrt(sd / float64(len(x)))
}
