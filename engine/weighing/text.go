package weighing

import (
	"fmt"
	"io"
	"math"
	"strings"

	"steelyard/engine/layout"
)

// WriteText writes the weighing for reading in a terminal.
func (w *Weighing) WriteText(out io.Writer) error {
	t := &text{w: w, unit: w.MassUnit()}
	t.title()
	t.verdict()
	t.masses()
	t.matched()
	t.ratios()
	t.levers()
	t.sensitivity()
	t.checks()
	t.section("Rests on", func(e Estimate) []string { return e.Assumes })
	t.cautions()
	_, err := io.WriteString(out, t.b.String())
	return err
}

type text struct {
	w    *Weighing
	b    strings.Builder
	unit float64 // power of ten in which masses are written
}

// MassUnit is the power of ten of a typical mass of the object.
func (w *Weighing) MassUnit() float64 {
	sum, n := 0.0, 0
	for _, e := range w.Estimates {
		for _, own := range e.Own {
			if own.Of == "critical" && own.Overdensity == 500 {
				sum, n = sum+math.Log10(own.Mass.Median), n+1
			}
		}
	}
	if n == 0 {
		return 1e14
	}
	return math.Pow(10, math.Floor(sum/float64(n)))
}

func (t *text) printf(format string, args ...any) { fmt.Fprintf(&t.b, format, args...) }

func (t *text) table(rows [][]string) { layout.Table(&t.b, rows) }

func (t *text) wrap(s string) { layout.Wrap(&t.b, "  ", 2, s) }

func (t *text) title() {
	c := t.w.Cosmology
	t.printf("%s at z = %g (H0 = %g km/s/Mpc, Ωm = %g, ΩΛ = %.6g", t.w.Object.Name, t.w.Object.Redshift, c.HubbleConstant, c.OmegaMatter, c.OmegaLambda)
	if c.W0 != nil {
		t.printf(", w0 = %g", *c.W0)
	}
	if c.Wa != nil {
		t.printf(", wa = %g", *c.Wa)
	}
	t.printf(")\n")
}

// checks lists the tests of data and fits, one line an estimate.
func (t *text) checks() {
	t.section("Checks", func(e Estimate) []string {
		var items []string
		if e.Quality.Dof > 0 {
			items = append(items, fmt.Sprintf("fit χ² = %.1f for %d", e.Quality.Chi2, e.Quality.Dof))
		}
		for _, c := range e.Checks {
			item := fmt.Sprintf("%s %.3g", c.Name, c.Statistic)
			if c.PValue != nil {
				item += fmt.Sprintf(" (p = %s)", probability(*c.PValue))
			}
			if !c.Passed {
				item += " FAILED"
			}
			items = append(items, item)
		}
		return items
	})
}

func (t *text) section(title string, items func(Estimate) []string) {
	wrote := false
	for _, e := range t.w.Estimates {
		list := items(e)
		if len(list) == 0 {
			continue
		}
		if !wrote {
			t.printf("\n%s\n", title)
			wrote = true
		}
		t.wrap(e.Name + ": " + strings.Join(list, "; "))
	}
}

// cautions gathers what a reader must know before believing a number.
func (t *text) cautions() {
	var lines []string
	for _, e := range t.w.Estimates {
		for _, c := range e.Checks {
			if !c.Passed && c.Note != "" {
				lines = append(lines, e.Name+": "+c.Note)
			}
		}
		for _, warning := range e.Warnings {
			lines = append(lines, e.Name+": "+warning)
		}
	}
	lines = append(lines, t.w.Warnings...)
	for _, f := range t.w.Failures {
		lines = append(lines, fmt.Sprintf("%s (%s) failed: %s", f.Node, f.Where, f.Reason))
	}
	if len(lines) == 0 {
		return
	}
	t.printf("\nCautions\n")
	for _, line := range lines {
		t.wrap(line)
	}
}

func star(extrapolated bool) string {
	if extrapolated {
		return "*"
	}
	return " "
}

func definition(own Own) string {
	switch own.Of {
	case "virial":
		return "virial"
	case "mean":
		return fmt.Sprintf("%gm", own.Overdensity)
	}
	return fmt.Sprintf("%gc", own.Overdensity)
}

func power(unit float64) string { return fmt.Sprintf("1e%.0f", math.Log10(unit)) }

// probability writes a p-value to two digits.
func probability(p float64) string {
	switch {
	case p >= 0.0995:
		return fmt.Sprintf("%.2f", p)
	case p >= 0.000995:
		return fmt.Sprintf("%.*f", 1-int(math.Floor(math.Log10(p))), p)
	}
	return fmt.Sprintf("%.0e", p)
}
