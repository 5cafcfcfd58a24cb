package weighing

import (
	"fmt"
	"strings"

	"steelyard/engine/layout"
)

// masses lists every estimate inside its own radii, and the combined profile.
func (t *text) masses() {
	if len(t.w.Estimates) == 0 {
		return
	}
	t.printf("\nInside each estimate's own radius, in %s Msun (median, 84th and 16th percentile)\n", power(t.unit))
	head := []string{""}
	for _, own := range t.w.Estimates[0].Own {
		head = append(head, "M_"+definition(own))
	}
	rows := [][]string{append(head, "R_500c, kpc")}
	beyond := false
	add := func(name string, list []Own) {
		row, radius := []string{name}, ""
		for _, own := range list {
			row = append(row, own.Mass.Scaled(t.unit).String()+star(own.Extrapolated))
			beyond = beyond || own.Extrapolated
			if own.Of == "critical" && own.Overdensity == 500 {
				radius = own.Radius.String()
			}
		}
		rows = append(rows, append(row, radius))
	}
	for _, e := range t.w.Estimates {
		add(e.Name, e.Own)
	}
	if t.w.Whole != nil {
		add("combined", t.w.Whole.Own)
		if t.w.Whole.Scattered != nil {
			add("with scatter", t.w.Whole.Scattered)
		}
	}
	t.table(rows)
	if beyond {
		t.printf("  * extrapolated: beyond the data of that estimate (combined: of one of them)\n")
	}
}

// place is one place of comparison as the text speaks of it.
type place struct {
	label  string
	own    bool    // each estimate at its own radius
	radius float64 // kpc, where all have one
}

// places lists the places compared, in order.
func (w *Weighing) places() []place {
	var all []place
	seen := map[string]bool{}
	for _, e := range w.Estimates {
		for _, at := range e.At {
			if !seen[at.At] {
				p := place{label: at.At, radius: at.Radius}
				for _, x := range w.Tensions {
					p.own = p.own || x.At == at.At && x.Radii == "own"
				}
				all = append(all, p)
			}
			seen[at.At] = true
		}
	}
	return all
}

// overdensity is "500" of "overdensity 500", "" of a fixed radius.
func (p place) overdensity() string {
	if short, ok := strings.CutPrefix(p.label, "overdensity "); ok {
		return short
	}
	return ""
}

// String is the place behind "within": "1264 kpc", "its own R_500".
func (p place) String() string {
	if p.own {
		return "each its own R_" + p.overdensity()
	}
	return fmt.Sprintf("%.0f kpc", p.radius)
}

func (t *text) at(label string) place {
	for _, p := range t.w.places() {
		if p.label == label {
			return p
		}
	}
	return place{label: label}
}

// matched lists the masses inside one radius for all, and their combination.
func (t *text) matched() {
	head, names := []string{""}, []string{}
	var places []place
	for _, p := range t.w.places() {
		if p.own {
			continue
		}
		places = append(places, p)
		head = append(head, fmt.Sprintf("M(<%s)", p))
		if o := p.overdensity(); o != "" {
			names = append(names, fmt.Sprintf("%s is R_%s of %s", p, o, t.w.RadiiFrom))
		}
	}
	if len(places) == 0 {
		return
	}
	title := fmt.Sprintf("Inside one radius for all, in %s Msun", power(t.unit))
	if len(names) > 0 {
		title += "; " + strings.Join(names, ", ")
	}
	t.printf("\n")
	layout.Wrap(&t.b, "", 2, title)
	rows := [][]string{head}
	for _, e := range t.w.Estimates {
		row := []string{e.Name}
		for _, p := range places {
			for _, at := range e.At {
				if at.At == p.label {
					row = append(row, at.Mass.Scaled(t.unit).String()+star(at.Extrapolated))
				}
			}
		}
		if len(row) > 1 {
			rows = append(rows, row)
		}
	}
	combined, scattered, any := []string{"combined"}, []string{"with scatter"}, false
	for _, p := range places {
		for _, c := range t.w.Combined {
			if c.At != p.label {
				continue
			}
			combined = append(combined, c.Mass.Scaled(t.unit).String()+" ")
			cell := "none needed "
			if c.Scattered != nil {
				cell, any = c.Scattered.Mass.Scaled(t.unit).String()+" ", true
			}
			scattered = append(scattered, cell)
		}
	}
	if len(combined) > 1 {
		rows = append(rows, combined)
		if any {
			rows = append(rows, scattered)
		}
	}
	t.table(rows)
	t.weights(places)
}

// weights says what the combination is made of at the first place, and calls out
// negative weights at any.
func (t *text) weights(places []place) {
	var items []string
	for _, c := range t.w.Combined {
		if c.At != places[0].label {
			continue
		}
		for _, e := range t.w.Estimates {
			if w, ok := c.Weights[e.Name]; ok {
				items = append(items, fmt.Sprintf("%.2f of %s", w, e.Name))
			}
		}
		line := fmt.Sprintf("Combined within %s: %s", places[0], strings.Join(items, ", "))
		if c.ScatterLn > 0 {
			line += fmt.Sprintf("; they scatter by %.2f in ln M beyond their errors", c.ScatterLn)
		}
		t.wrap(line)
	}
	for _, c := range t.w.Combined {
		for _, e := range t.w.Estimates {
			if c.Weights[e.Name] < 0 {
				t.wrap(fmt.Sprintf("NEGATIVE WEIGHT of %s at %s: what it shares with the others outweighs what it adds, and the combined mass may lie outside all of them", e.Name, c.At))
			}
		}
	}
}

// ratios lists every pair, and all together, place by place.
func (t *text) ratios() {
	if len(t.w.Tensions) == 0 && len(t.w.Spreads) == 0 {
		return
	}
	places := t.w.places()
	head := []string{""}
	for _, p := range places {
		head = append(head, "within "+p.String(), "σ")
	}
	t.printf("\nRatios (own radii where said, matched otherwise)\n")
	rows := [][]string{head}
	index := map[string]int{}
	for _, x := range t.w.Tensions {
		name := x.A + " / " + x.B
		if _, ok := index[name]; !ok {
			index[name] = len(rows)
			rows = append(rows, []string{name})
		}
		rows[index[name]] = append(rows[index[name]], x.Ratio.String(), about(x.Tail)+fmt.Sprintf("%+.1f", x.Sigma)+doubt(x.Doubtful))
	}
	all := []string{"all together"}
	for _, c := range t.w.Consistency {
		all = append(all, fmt.Sprintf("χ² = %.1f for %d", c.Chi2, c.Dof), about(c.Tail)+fmt.Sprintf("%.1f", c.Sigma)+doubt(c.Doubtful))
	}
	if len(all) > 1 && len(rows) > 2 {
		rows = append(rows, all)
	}
	t.table(rows)
	for _, s := range t.w.Spreads {
		t.wrap(fmt.Sprintf("Method spread, same data: %s / %s = %.2f within %s", s.A, s.B, s.Ratio, t.at(s.At)))
	}
}

func about(tail bool) string {
	if tail {
		return "≈"
	}
	return ""
}

// doubt marks a number that rests on an estimate not to be believed.
func doubt(reasons []string) string {
	if len(reasons) > 0 {
		return "†"
	}
	return ""
}
