package lensing

import (
	"fmt"

	"steelyard/probes/estimate"
)

// farthest is a redshift that no source reaches.
const farthest = 1100

// sourceEfficiency returns ⟨β⟩ and ⟨β²⟩ of the sources of a data block that are
// described as a whole, by one redshift or by a distribution.
func sourceEfficiency(t *estimate.Task, block string) (beta, beta2 float64, err error) {
	lens := t.Object.Redshift
	e := newEfficiencies(t.Cosmology, lens, lens)
	one, table := t.Blocks[block]["source_redshift"], t.Tables[block+".sources"]
	switch {
	case one.Set && table != nil:
		return 0, 0, fmt.Errorf("%s: the redshifts of the sources are given twice, by `source_redshift` and by `sources`", block)
	case one.Set:
		z := one.Prior.A
		if z <= lens {
			return 0, 0, fmt.Errorf("%s: the sources at redshift %g lie in front of the lens at redshift %g", block, z, lens)
		}
		b := e.exact(z)
		return b, b * b, nil
	case table == nil:
		return 0, 0, fmt.Errorf("%s: it is not said how far the sources are: give `source_redshift` or `sources { … }`, or a catalogue's column `redshift`", block)
	}
	z, w := table.Values("redshift"), table.Values("weight")
	if w == nil {
		w = ones(len(z))
	}
	total, behind := 0.0, 0.0
	for i := range z {
		switch {
		case !(z[i] >= 0 && z[i] < farthest):
			return 0, 0, fmt.Errorf("%s, row %d: redshift %g", table.File, table.Rows[i], z[i])
		case !(w[i] >= 0):
			return 0, 0, fmt.Errorf("%s, row %d: weight %g is below zero", table.File, table.Rows[i], w[i])
		}
		total += w[i]
		if z[i] > lens {
			behind += w[i]
		}
	}
	switch {
	case total == 0:
		return 0, 0, fmt.Errorf("%s: every weight is zero", table.File)
	case behind == 0:
		return 0, 0, fmt.Errorf("%s: all sources lie in front of the lens at redshift %g", table.File, lens)
	}
	beta, beta2 = e.mean(z, w)
	return beta, beta2, nil
}

func ones(n int) []float64 {
	out := make([]float64, n)
	for i := range out {
		out[i] = 1
	}
	return out
}
