package reconcile

import (
	"errors"
	"fmt"
	"math"

	"steelyard/probes/cosmology"
	"steelyard/probes/halo"
	"steelyard/probes/infer"
)

// Estimate is one mass estimate to be compared.
type Estimate struct {
	Name  string // reference in the recipe: "lensing.shapes.nfw"
	Block string // the block whose data it is made from: "lensing.shapes"
	Draws *infer.Draws
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

// Own is From when each estimate is read at its own radius, draw by draw.
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

// OwnMass is an estimate's mass inside its own radius of an overdensity.
type OwnMass struct {
	Definition   halo.Definition
	Radius       Interval // kpc
	Mass         Interval // Msun
	Extrapolated bool
}

// OwnMasses reads an estimate at its own radii, R_Δ and M_Δ found draw by draw.
func OwnMasses(d *infer.Draws, definitions []halo.Definition, b Background) ([]OwnMass, error) {
	out := make([]OwnMass, len(definitions))
	for k, def := range definitions {
		threshold, err := b.threshold(def)
		if err != nil {
			return nil, err
		}
		radii, ln, outside := ownRadii(d, threshold)
		mass, radius := expInterval(ln), interval(radii)
		out[k] = OwnMass{def, radius, mass, outside > 0 || extrapolated(d.Covers, radius.Median)}
	}
	return out, nil
}

// ownRadii returns each draw's R_Δ in kpc and ln M_Δ, and how many draws have
// no such radius on the grid; those are put at its nearer end.
func ownRadii(d *infer.Draws, threshold float64) (radii, ln []float64, outside int) {
	radii, ln = make([]float64, d.N), make([]float64, d.N)
	for i := range d.N {
		r, ok := d.RadiusAt(i, threshold)
		if !ok {
			outside++
			r = d.Radii[0]
			if last := d.Radii[len(d.Radii)-1]; 3*math.Exp(d.LnMassAt(i, math.Log(last))) > 4*math.Pi*threshold*last*last*last {
				r = last
			}
		}
		radii[i], ln[i] = r, d.LnMassAt(i, math.Log(r))
	}
	return radii, ln, outside
}

// extrapolated allows 1%, so that a mass at one radius is not called
// extrapolated at that radius for the rounding of its draws.
func extrapolated(covers [2]float64, r float64) bool {
	return r < covers[0]*0.99 || r > covers[1]*1.01
}

// Matching holds the compared estimates' masses at every place.
type Matching struct {
	Names    []string // of the estimates
	Blocks   []string // whose data each is made from
	Places   []Matched
	Warnings []string
}

// Matched holds every estimate's mass at one place.
type Matched struct {
	At    At
	Own   bool // read at each estimate's own radius rather than at one radius
	Marks []Mark
	// LnMass[k][i] is ln M of estimate k in joint draw i; Common[k][i] is the part
	// of it that the shared nuisances of draw i carry, nil when nothing is shared.
	LnMass, Common [][]float64
}

// Mark is one estimate's mass at one place, from its own draws alone.
type Mark struct {
	Name         string
	Radius       float64 // kpc; the median where each draw has its own
	Mass         Interval
	LnMean, LnSD float64
	Extrapolated bool
}

// MatchAll joins the estimates and reads them at every place: at one radius for
// all, which for an overdensity is the median R_Δ of the estimate named from, or
// (from Own) each at its own radius, draw by draw.
func MatchAll(estimates []Estimate, places []At, from string, b Background, stream infer.Stream) (*Matching, error) {
	if len(estimates) < 2 {
		return nil, errors.New("a comparison needs two estimates or more")
	}
	joint, err := Transport(estimates, stream)
	if err != nil {
		return nil, err
	}
	m := &Matching{Warnings: joint.Warnings}
	for _, e := range estimates {
		m.Names, m.Blocks = append(m.Names, e.Name), append(m.Blocks, e.Block)
	}
	for _, at := range places {
		place, err := match(estimates, joint, at, from, b)
		if err != nil {
			return nil, fmt.Errorf("%s: %w", at, err)
		}
		m.Places = append(m.Places, *place)
	}
	return m, nil
}

func match(estimates []Estimate, joint *Joint, at At, from string, b Background) (*Matched, error) {
	m := &Matched{At: at, Own: at.Radius == 0 && from == Own}
	radius, threshold := at.Radius, 0.0
	if at.Radius == 0 {
		var err error
		if threshold, err = b.threshold(at.Definition); err != nil {
			return nil, err
		}
		if !m.Own {
			if radius, err = referenceRadius(estimates, from, threshold); err != nil {
				return nil, err
			}
		}
	}
	for k, e := range estimates {
		ln, mark := read(e.Draws, radius, threshold)
		mark.Name, mark.Mass = e.Name, expInterval(ln)
		mark.LnMean, mark.LnSD = meanSD(ln)
		m.Marks = append(m.Marks, mark)
		shared, _ := read(joint.Profiles[k], radius, threshold)
		m.LnMass = append(m.LnMass, shared)
		common, err := commonPart(shared, joint, e)
		if err != nil {
			return nil, fmt.Errorf("%s: %w", e.Name, err)
		}
		m.Common = append(m.Common, common)
	}
	return m, nil
}

func referenceRadius(estimates []Estimate, from string, threshold float64) (float64, error) {
	for _, e := range estimates {
		if e.Name == from {
			radii, _, outside := ownRadii(e.Draws, threshold)
			if 2*outside > e.Draws.N {
				return 0, fmt.Errorf("most draws of %s have no such radius between 1 kpc and 30 Mpc", from)
			}
			return interval(radii).Median, nil
		}
	}
	return 0, fmt.Errorf("the estimate %q, whose radii were asked for, is not among those compared", from)
}

// read gives ln M of every draw inside radius, or inside each draw's own radius
// of the mean density threshold when radius is 0.
func read(d *infer.Draws, radius, threshold float64) ([]float64, Mark) {
	if radius == 0 {
		radii, ln, outside := ownRadii(d, threshold)
		r := interval(radii).Median
		return ln, Mark{Radius: r, Extrapolated: outside > 0 || extrapolated(d.Covers, r)}
	}
	ln := make([]float64, d.N)
	for i := range ln {
		ln[i] = d.LnMassAt(i, math.Log(radius))
	}
	return ln, Mark{Radius: radius, Extrapolated: extrapolated(d.Covers, radius)}
}

// commonPart is the polynomial regression of ln M on the joint scores of the shared
// nuisances that the estimate names.
func commonPart(ln []float64, joint *Joint, e Estimate) ([]float64, error) {
	var named []int
	for j, name := range joint.Nuisances {
		for _, n := range e.Draws.Nuisances {
			if n.Name == name {
				named = append(named, j)
			}
		}
	}
	if len(named) == 0 {
		return nil, nil
	}
	rows := make([][]float64, joint.N)
	for i := range rows {
		rows[i] = make([]float64, len(named))
		for c, j := range named {
			rows[i][c] = joint.Scores[i][j]
		}
	}
	basis := newPolynomial(rows)
	fit, err := basis.fit(rows, ln, 1)
	if err != nil {
		return nil, err
	}
	common, value := make([]float64, joint.N), make([]float64, 1)
	for i, x := range rows {
		fit.at(x, value)
		common[i] = value[0]
	}
	return common, nil
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
