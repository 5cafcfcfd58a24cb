package xray

import (
	"fmt"

	"steelyard/probes/catalogue"
	"steelyard/probes/estimate"
)

// readMixing takes from a table which share of the light of each annulus the
// telescope spreads into each: row-major, share[into*n+from]. Annuli are
// numbered from 1 in the order of the temperature file, outside in when
// reversed. Pairs that are left out share nothing.
func readMixing(t *estimate.Task, table *catalogue.Table, n int, reversed bool) ([]float64, error) {
	share, given, sent := make([]float64, n*n), make([]bool, n*n), make([]float64, n)
	from, into, value := table.Values("from"), table.Values("into"), table.Values("share")
	if len(from) != table.Len() || len(into) != table.Len() || len(value) != table.Len() {
		return nil, t.Errorf("%s: a mixing matrix needs the columns from, into and share", table.File)
	}
	var faults []string
	fault := func(i int, format string, args ...any) {
		faults = append(faults, fmt.Sprintf("%s, row %d: %s", table.File, table.Rows[i], fmt.Sprintf(format, args...)))
	}
	place := func(x float64) (int, bool) {
		k := int(x)
		if float64(k) != x || k < 1 || k > n {
			return 0, false
		}
		if reversed {
			return n - k, true
		}
		return k - 1, true
	}
	for i, v := range value {
		a, okA := place(from[i])
		b, okB := place(into[i])
		switch {
		case !okA || !okB:
			fault(i, "from %g into %g: annuli are numbered from 1 to %d", from[i], into[i], n)
		case given[b*n+a]:
			fault(i, "from %g into %g is given twice", from[i], into[i])
		case v < 0 || v > 1:
			fault(i, "a share of %g does not lie between 0 and 1", v)
		default:
			share[b*n+a], given[b*n+a] = v, true
			sent[a] += v
		}
	}
	for a, sum := range sent {
		const rounding = 1e-3
		number := a + 1
		if reversed {
			number = n - a
		}
		if len(faults) == 0 && !(sum > 0 && sum <= 1+rounding) {
			faults = append(faults, fmt.Sprintf("%s: the shares of annulus %d add up to %g; they lie above 0 and no higher than 1", table.File, number, sum))
		}
	}
	if err := complain(t, table, faults); err != nil {
		return nil, err
	}
	return share, nil
}

// mix spreads the weights of the annuli as the telescope spreads their light:
// each bin then sees the sum of what reaches it.
func mix(share []float64, weights [][]float64) [][]float64 {
	n := len(weights)
	out := make([][]float64, n)
	for into := range out {
		out[into] = make([]float64, len(weights[into]))
		for from, w := range weights {
			for j, x := range w {
				out[into][j] += share[into*n+from] * x
			}
		}
	}
	return out
}
