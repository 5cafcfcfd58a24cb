package lensing

import (
	"context"
	"fmt"
	"math"

	"steelyard/probes/estimate"
)

// shapes is a shape catalogue ready to be gathered into bins.
type shapes struct {
	file            string
	rows            []int // numbers in the file, for messages
	ra, dec, e1, e2 []float64
	weight          []float64 // nil: all equal
	redshift        []float64 // nil: beta and beta2 hold for every source
	bias            []float64 // multiplicative, of each shape; nil: none
	additive1       float64   // taken off e1
	additive2       float64   // and off e2, as in the file
	responsivity    float64
	beta, beta2     float64
	efficiencies    *efficiencies // of redshift
	mirror          float64       // −1 when the x axis of the shapes points west, else 1
	centre          centre
	distance        float64   // kpc per radian at the lens
	edges           []float64 // kpc
}

// reduceGalaxies gathers a shape catalogue into a profile about the object's
// centre: weighted means of the tangential and cross components, with errors
// from the weighted dispersion of the shapes.
func reduceGalaxies(ctx context.Context, t *estimate.Task) (*Profile, error) {
	s, err := newShapes(t)
	if err != nil {
		return nil, err
	}
	warnings, err := s.duplicates()
	if err != nil {
		return nil, err
	}
	total, err := s.gather(ctx, t.Sampling.Workers)
	if err != nil {
		return nil, err
	}
	p, err := s.profile(total)
	if err != nil {
		return nil, err
	}
	p.Warnings = append(p.Warnings, warnings...)
	return p, nil
}

// newShapes checks all but the shapes themselves, which gather checks.
func newShapes(t *estimate.Task) (*shapes, error) {
	table, block := t.Tables["galaxies"], t.Blocks["galaxies"]
	bins, binned := t.Blocks["bins"]
	switch {
	case !t.Object.HasCentre:
		return nil, fmt.Errorf("shapes are measured about a centre: the object needs `centre = sky(…)`")
	case !binned:
		return nil, fmt.Errorf("a shape catalogue needs a block `bins` that says how to gather it")
	case table.Len() == 0:
		return nil, fmt.Errorf("%s: no galaxy is left to measure", table.File)
	}
	s := &shapes{
		file: table.File, rows: table.Rows,
		ra: table.Values("ra"), dec: table.Values("dec"), e1: table.Values("e1"), e2: table.Values("e2"),
		weight: table.Values("weight"), redshift: table.Values("redshift"), bias: table.Values("multiplicative"),
		additive1: block["additive_e1"].Prior.A, additive2: block["additive_e2"].Prior.A, responsivity: 1,
		mirror: 1, centre: newCentre(t.Object.RA, t.Object.Dec),
		distance: t.Cosmology.AngularDiameter(t.Object.Redshift),
	}
	if r := block["responsivity"]; r.Set {
		s.responsivity = r.Prior.A
	}
	if block["handedness"].Text == "west" {
		s.mirror = -1
	}
	var err error
	if s.edges, err = binEdges(bins); err != nil {
		return nil, err
	}
	if s.redshift == nil {
		s.beta, s.beta2, err = sourceEfficiency(t, "galaxies")
		return s, err
	}
	if block["source_redshift"].Set || t.Tables["galaxies.sources"] != nil {
		return nil, fmt.Errorf("galaxies: the redshifts of the sources are given twice, by the column `redshift` and by `source_redshift` or `sources`")
	}
	far := 0.0
	for i, z := range s.redshift {
		// Photometric redshifts scatter below zero; −1 and −99 mean "none".
		if !(z > -0.5 && z < farthest) {
			return nil, fmt.Errorf("%s, row %d: redshift %g; leave out such rows with `select`", s.file, s.rows[i], z)
		}
		far = max(far, z)
	}
	if far <= t.Object.Redshift {
		return nil, fmt.Errorf("%s: all %d sources lie in front of the lens at redshift %g (the farthest at %g)", s.file, len(s.rows), t.Object.Redshift, far)
	}
	s.efficiencies = newEfficiencies(t.Cosmology, t.Object.Redshift, far)
	return s, nil
}

// profile turns the sums over the bins into shears with errors. The error of a
// bin's weighted mean is
//
//	σ = σ_e (Σw²)^½ / Σw
//
// with σ_e the dispersion of one component about its bin's mean, weighted by w²
// and taken over both components and all bins together, which leaves it right
// when the weights follow each galaxy's own noise. Turning all shapes at random
// would scatter the mean by (Σ w² |e|²/2)^½ / Σw, bin by bin, which is kept
// beside it for a check. All are then calibrated.
func (s *shapes) profile(total *sums) (*Profile, error) {
	if total.weight == 0 {
		return nil, fmt.Errorf("%s: every weight is zero", s.file)
	}
	if gap := total.directions.gap(); gap >= math.Pi {
		return nil, fmt.Errorf("the object's centre lies outside the field of %s: seen from it, %.0f degrees of directions hold no galaxy; check `centre` and the units of `ra` and `dec`", s.file, gap*180/math.Pi)
	}
	square, weight := 0.0, 0.0
	for i := range total.bins {
		a := &total.bins[i]
		if a.n < 2 {
			continue
		}
		t, x := a.tangential/a.w, a.cross/a.w
		scatter := a.square2 - 2*(t*a.tangential2+x*a.cross2) + (t*t+x*x)*a.w2
		square += scatter * float64(a.n) / float64(a.n-1)
		weight += 2 * a.w2
	}
	if !(square > 0) {
		return nil, fmt.Errorf("%s: the shapes in the bins from %.4g to %.4g kpc do not scatter, so they have no errors: too few galaxies, or not measured shapes", s.file, s.edges[0], s.edges[len(s.edges)-1])
	}
	dispersion := math.Sqrt(square / weight)
	p := &Profile{HasCross: true, Counted: true}
	for i := range total.bins {
		a, inner, outer := &total.bins[i], s.edges[i], s.edges[i+1]
		if a.n == 0 {
			p.Warnings = append(p.Warnings, fmt.Sprintf("%s: no galaxy between %.4g and %.4g kpc; that bin is left out", s.file, inner, outer))
			continue
		}
		if !(a.calibrated > 0) {
			return nil, fmt.Errorf("%s: the multiplicative biases between %.4g and %.4g kpc leave no shear", s.file, inner, outer)
		}
		unit := a.calibrated * s.responsivity // what a unit shear adds up to
		sigma := dispersion * math.Sqrt(a.w2) / unit
		p.Bins = append(p.Bins, Bin{
			Inner: inner, Outer: outer, Mean: a.radius / a.w,
			Shear: a.tangential / unit, Minus: sigma, Plus: sigma, Cross: a.cross / unit, Flipped: a.flipped / unit,
			Turned: math.Sqrt(a.square2/2) / unit,
			Beta:   a.beta / a.w, Beta2: a.beta2 / a.w, Sources: a.n, Weight: a.w,
			Nodes: momentNodes(a.place[:], inner, outer),
		})
	}
	if len(p.Bins) < fewest {
		return nil, fmt.Errorf("%s: only %d of %d bins hold galaxies; at least %d are needed", s.file, len(p.Bins), len(total.bins), fewest)
	}
	return p, nil
}
