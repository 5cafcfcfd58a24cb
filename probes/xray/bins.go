package xray

import (
	"fmt"
	"slices"
	"strings"

	"steelyard/probes/catalogue"
	"steelyard/probes/estimate"
)

// Bins are measurements in shells or annuli, from the centre outwards.
type Bins struct {
	Inner, Outer []float64 // edges, kpc
	Value        []float64
	Minus, Plus  []float64 // sizes of the errors below and above
	Notes        []string  // what the reader should know about these bins
}

// Len returns the number of bins.
func (b *Bins) Len() int { return len(b.Value) }

// touching is the fraction of a bin's width by which neighbours may miss each
// other, from rounding in the file, and still be taken to touch.
const touching = 1e-3

// mostComplaints bounds how many faults of one file are listed.
const mostComplaints = 8

// readBins takes bins out of a table: edges as inner and outer or as radius and
// half_width, errors as error, minus and plus or low and high. It refuses what
// cannot be a profile, naming the file and the row.
//
// A density or a temperature is positive; a surface brightness may fall below
// zero when a background was taken off.
func readBins(t *estimate.Task, block, quantity string) (*Bins, error) {
	table := t.Tables[block]
	if table == nil {
		return nil, t.Errorf("the block %q has no file", block)
	}
	if table.Len() == 0 {
		return nil, t.Errorf("%s: no rows", table.File)
	}
	b := &Bins{Inner: slices.Clone(t.Kpc(table.Column("inner"))), Outer: slices.Clone(t.Kpc(table.Column("outer")))}
	if radius, half := t.Kpc(table.Column("radius")), t.Kpc(table.Column("half_width")); radius != nil && half != nil {
		for i, r := range radius {
			b.Inner = append(b.Inner, r-half[i])
			b.Outer = append(b.Outer, r+half[i])
		}
	}
	b.Value = slices.Clone(table.Values("value"))
	switch {
	case table.Column("error") != nil:
		b.Minus, b.Plus = slices.Clone(table.Values("error")), slices.Clone(table.Values("error"))
	case table.Column("minus") != nil && table.Column("plus") != nil:
		b.Minus, b.Plus = slices.Clone(table.Values("minus")), slices.Clone(table.Values("plus"))
	case table.Column("low") != nil && table.Column("high") != nil:
		for i, v := range b.Value {
			b.Minus = append(b.Minus, v-table.Values("low")[i])
			b.Plus = append(b.Plus, table.Values("high")[i]-v)
		}
	}
	if len(b.Inner) != table.Len() || len(b.Outer) != table.Len() || len(b.Value) != table.Len() || len(b.Minus) != table.Len() {
		return nil, t.Errorf("%s: a profile needs its edges (inner and outer, or radius and half_width), its values, and their errors (error, or minus and plus, or low and high)", table.File)
	}
	rows := slices.Clone(table.Rows)
	if b.Len() > 1 && b.Inner[0] > b.Inner[b.Len()-1] {
		// Some tables run from the outside in.
		for _, s := range [][]float64{b.Inner, b.Outer, b.Value, b.Minus, b.Plus} {
			slices.Reverse(s)
		}
		slices.Reverse(rows)
	}
	return b, b.check(t, table, rows, quantity)
}

// check refuses impossible rows, and snaps edges that touch but for rounding.
func (b *Bins) check(t *estimate.Task, table *catalogue.Table, rows []int, quantity string) error {
	var faults []string
	fault := func(i int, format string, args ...any) {
		faults = append(faults, fmt.Sprintf("%s, row %d: %s", table.File, rows[i], fmt.Sprintf(format, args...)))
	}
	for i := range b.Value {
		width := b.Outer[i] - b.Inner[i]
		if width > 0 && b.Inner[i] < 0 && -b.Inner[i] < touching*width {
			b.Inner[i] = 0
		}
		switch {
		case b.Inner[i] < 0:
			fault(i, "the bin begins at %.4g kpc, inside the centre", b.Inner[i])
		case width <= 0:
			fault(i, "the outer edge, %.4g kpc, does not lie outside the inner edge, %.4g kpc", b.Outer[i], b.Inner[i])
		case b.Value[i] <= 0 && quantity != brightness:
			fault(i, "a %s of %g is not positive; leave out bins without a detection", quantity, b.Value[i])
		case b.Minus[i] == 0 || b.Plus[i] == 0:
			fault(i, "an error of zero on the %s: a bin without an error cannot be weighed against the others", quantity)
		case b.Minus[i] < 0 || b.Plus[i] < 0:
			fault(i, "a negative error on the %s (%g below, %g above): minus and plus are sizes, low and high are bounds around the value", quantity, b.Minus[i], b.Plus[i])
		}
		if i == 0 || width <= 0 {
			continue
		}
		gap, least := b.Inner[i]-b.Outer[i-1], min(width, b.Outer[i-1]-b.Inner[i-1])
		switch {
		case b.Inner[i] <= b.Inner[i-1]:
			fault(i, "the bins are not in order of radius: this one begins at %.4g kpc, the one in row %d at %.4g kpc", b.Inner[i], rows[i-1], b.Inner[i-1])
		case gap < -touching*least:
			fault(i, "the bin overlaps the one in row %d: it begins at %.4g kpc, inside that one's outer edge at %.4g kpc", rows[i-1], b.Inner[i], b.Outer[i-1])
		case gap < touching*least:
			b.Inner[i] = b.Outer[i-1]
		default:
			b.Notes = append(b.Notes, fmt.Sprintf("%s: no %s between %.4g kpc and %.4g kpc (rows %d and %d)", table.File, quantity, b.Outer[i-1], b.Inner[i], rows[i-1], rows[i]))
		}
	}
	return complain(t, table, faults)
}

// complain makes one error of the faults of a file, nil of none.
func complain(t *estimate.Task, table *catalogue.Table, faults []string) error {
	if len(faults) == 0 {
		return nil
	}
	if more := len(faults) - mostComplaints; more > 0 {
		faults = append(faults[:mostComplaints], fmt.Sprintf("%s: and %d more", table.File, more))
	}
	return t.Errorf("%s", strings.Join(faults, "; "))
}
