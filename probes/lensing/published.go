package lensing

import (
	"fmt"
	"math"

	"steelyard/probes/catalogue"
	"steelyard/probes/estimate"
)

// readProfile turns a published profile into a Profile.
func readProfile(t *estimate.Task) (*Profile, error) {
	table := t.Tables["profile"]
	if table.Len() < fewest {
		return nil, fmt.Errorf("%s: %d bins; at least %d are needed", table.File, table.Len(), fewest)
	}
	beta, beta2, err := sourceEfficiency(t, "profile")
	if err != nil {
		return nil, err
	}
	p := &Profile{Bins: make([]Bin, table.Len()), HasCross: table.Column("cross") != nil}
	value, cross := table.Values("value"), table.Values("cross")
	for i := range p.Bins {
		p.Bins[i] = Bin{Shear: value[i], Beta: beta, Beta2: beta2}
		if cross != nil {
			p.Bins[i].Cross = cross[i]
		}
	}
	if err := readRadii(t, table, p.Bins); err != nil {
		return nil, err
	}
	if err := readErrors(table, p.Bins); err != nil {
		return nil, err
	}
	for i, b := range p.Bins {
		if math.Abs(b.Shear) > 1 || math.Abs(b.Cross) > 1 {
			return nil, fmt.Errorf("%s, row %d: a reduced shear above 1; it is a mean ellipticity, which lies below", table.File, table.Rows[i])
		}
	}
	if c := t.Tables["profile.covariance"]; c != nil {
		if err := readCovariance(c, p); err != nil {
			return nil, err
		}
	}
	return p, nil
}

// readRadii fills in the extent of the bins and where a model is evaluated.
func readRadii(t *estimate.Task, table *catalogue.Table, bins []Bin) error {
	at := t.Kpc(table.Column("radius"))
	inner, outer := t.Kpc(table.Column("inner")), t.Kpc(table.Column("outer"))
	for i := range bins {
		row, b := table.Rows[i], &bins[i]
		if at != nil {
			b.Inner, b.Outer, b.Mean = at[i], at[i], at[i]
			switch {
			case !(at[i] > 0):
				return fmt.Errorf("%s, row %d: radius %.4g kpc is not above zero", table.File, row, at[i])
			case i > 0 && !(at[i] > at[i-1]):
				return fmt.Errorf("%s, row %d: radius %.4g kpc does not lie beyond the row before (%.4g kpc); sort the rows by radius", table.File, row, at[i], at[i-1])
			}
			b.Nodes = []Node{{at[i], 1}}
			continue
		}
		b.Inner, b.Outer = inner[i], outer[i]
		switch {
		case !(b.Inner >= 0):
			return fmt.Errorf("%s, row %d: the inner radius %.4g kpc is below zero", table.File, row, b.Inner)
		case !(b.Outer > b.Inner):
			return fmt.Errorf("%s, row %d: the outer radius %.4g kpc does not lie beyond the inner one (%.4g kpc)", table.File, row, b.Outer, b.Inner)
		case i > 0 && b.Inner < bins[i-1].Inner:
			return fmt.Errorf("%s, row %d: the bin begins inside the row before; sort the rows by radius", table.File, row)
		case i > 0 && b.Inner < bins[i-1].Outer*(1-1e-6): // edges are quoted rounded
			return fmt.Errorf("%s, row %d: the bin begins at %.5g kpc, where the row before ends at %.5g kpc: the bins overlap", table.File, row, b.Inner, bins[i-1].Outer)
		}
		b.Nodes = areaNodes(b.Inner, b.Outer, areaCount(b.Inner, b.Outer))
		// The mean radius of an evenly filled annulus is ⅔ (b³−a³)/(b²−a²).
		b.Mean = 2.0 / 3 * (b.Outer + b.Inner*b.Inner/(b.Outer+b.Inner))
	}
	return nil
}

// readErrors fills in the errors, however they were given.
func readErrors(table *catalogue.Table, bins []Bin) error {
	symmetric := table.Values("error")
	minus, plus := table.Values("minus"), table.Values("plus")
	low, high := table.Values("low"), table.Values("high")
	for i := range bins {
		b := &bins[i]
		switch {
		case symmetric != nil:
			b.Minus, b.Plus = symmetric[i], symmetric[i]
		case minus != nil && plus != nil:
			b.Minus, b.Plus = minus[i], plus[i]
		case low != nil && high != nil:
			b.Minus, b.Plus = b.Shear-low[i], high[i]-b.Shear
		default:
			return fmt.Errorf("%s: the profile has no errors: give `error`, or `minus` and `plus`, or `low` and `high`", table.File)
		}
		row := table.Rows[i]
		switch {
		case low != nil && !(b.Minus > 0 && b.Plus > 0):
			return fmt.Errorf("%s, row %d: the shear %g does not lie between its bounds `low` = %g and `high` = %g", table.File, row, b.Shear, low[i], high[i])
		case !(b.Minus > 0):
			return fmt.Errorf("%s, row %d: the error below, %g, is not above zero", table.File, row, b.Minus)
		case !(b.Plus > 0):
			return fmt.Errorf("%s, row %d: the error above, %g, is not above zero", table.File, row, b.Plus)
		}
	}
	return nil
}
