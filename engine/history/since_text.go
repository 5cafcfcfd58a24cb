package history

import (
	"cmp"
	"fmt"
	"io"
	"math"
	"slices"
	"strings"
	"time"

	"steelyard/engine/layout"
)

// most is how many lines of one kind fit on a screen; --json has them all.
const most = 10

// WriteText writes the comparison on one screen of a terminal, masses in units
// of unit Msun.
func (c *Comparison) WriteText(out io.Writer, unit float64, zone *time.Location) error {
	t := &sinceText{Comparison: c, unit: unit}
	t.printf("%s: weighing %d of %s compared with %d of %s\n", c.Object.Name,
		c.To.Number, Stamp(c.To.Finished.In(zone)), c.From.Number, Stamp(c.From.Finished.In(zone)))
	t.inputs()
	t.masses()
	t.tensions()
	t.failures()
	_, err := io.WriteString(out, t.b.String())
	return err
}

type sinceText struct {
	*Comparison
	b    strings.Builder
	unit float64
}

func (t *sinceText) printf(format string, args ...any) { fmt.Fprintf(&t.b, format, args...) }

// list writes lines under a title, as many as fit.
func (t *sinceText) list(title string, lines []string) {
	if len(lines) == 0 {
		return
	}
	t.printf("\n%s\n", title)
	for i, line := range lines {
		if i == most-1 && len(lines) > most {
			t.printf("  and %d more: --json lists them\n", len(lines)-i)
			return
		}
		layout.Wrap(&t.b, "  ", 2, line)
	}
}

// inputs writes what went in.
func (t *sinceText) inputs() {
	var lines []string
	for _, f := range t.Files {
		switch of := strings.Join(f.Of, ", "); {
		case f.From == "":
			lines = append(lines, fmt.Sprintf("%s is new (%s)", f.Path, of))
		case f.To == "":
			lines = append(lines, fmt.Sprintf("%s is no longer read (%s)", f.Path, of))
		default:
			lines = append(lines, fmt.Sprintf("%s: content %s → %s (%s)", f.Path, short(f.From), short(f.To), of))
		}
	}
	t.list("Data that changed", lines)
	t.list("Assumptions that changed", described(t.Assumptions))
	t.list("Program", described(t.Program))
	if t.Same() {
		t.printf("\nNothing changed in data, assumptions or program.\n")
	}
}

func described(changes []Change) (lines []string) {
	for _, x := range changes {
		switch {
		case x.From == "":
			lines = append(lines, fmt.Sprintf("%s is new: %s", x.Name, x.To))
		case x.To == "":
			lines = append(lines, fmt.Sprintf("%s is gone; it was %s", x.Name, x.From))
		default:
			lines = append(lines, fmt.Sprintf("%s: %s → %s", x.Name, x.From, x.To))
		}
	}
	return lines
}

// masses writes one line an estimate: the mass inside its own R_500 in full, of
// the others only how far they moved.
func (t *sinceText) masses() {
	const shown = "overdensity 500"
	head := []string{"", "M_500 before", "now", "moved"}
	var others []string // further overdensities, as the first estimate has them
	rows := map[string][]string{}
	var order, still []string
	for _, m := range t.Masses {
		if !m.Own {
			continue
		}
		if rows[m.Estimate] == nil {
			rows[m.Estimate] = []string{m.Estimate, "", "", ""}
			order = append(order, m.Estimate)
		}
		row := rows[m.Estimate]
		if m.Inside == shown {
			row[1], row[2] = m.From.Scaled(t.unit).String(), m.To.Scaled(t.unit).String()
			row[3] = inErrors(m.Moved)
			continue
		}
		if len(order) == 1 {
			others = append(others, m.Inside)
		}
		rows[m.Estimate] = append(row, inErrors(m.Moved))
	}
	for _, inside := range others {
		head = append(head, "M_"+strings.TrimPrefix(inside, "overdensity "))
	}
	table := [][]string{head}
	for _, name := range order {
		if t.still(name) {
			still = append(still, name)
		} else {
			table = append(table, rows[name])
		}
	}
	if len(table) > 1 {
		t.printf("\nMasses in 1e%d Msun, each inside its own radius, moved in units of the earlier error\n", exponent(t.unit))
		layout.Table(&t.b, table)
	}
	if len(still) > 0 {
		t.printf("\n")
		layout.Wrap(&t.b, "Masses that did not move: ", 0, strings.Join(still, ", "))
	}
	if len(t.Appeared) > 0 {
		layout.Wrap(&t.b, "New estimates: ", 0, strings.Join(t.Appeared, ", "))
	}
	if len(t.Gone) > 0 {
		layout.Wrap(&t.b, "Estimates that are gone: ", 0, strings.Join(t.Gone, ", "))
	}
}

// still says whether all of an estimate's own masses are what they were.
func (t *sinceText) still(estimate string) bool {
	for _, m := range t.Masses {
		if m.Own && m.Estimate == estimate && m.From != m.To {
			return false
		}
	}
	return true
}

// tensions writes one line a pair: of too many, those whose significance moved
// furthest.
func (t *sinceText) tensions() {
	var moved []TensionMove
	for _, x := range t.Tensions {
		if x.From != x.To || x.SigmaFrom != x.SigmaTo {
			moved = append(moved, x)
		}
	}
	shown := furthest(moved)
	rows := [][]string{{"", "ratio", "moved", "σ"}}
	for i, x := range shown {
		if i == 0 || x.At != shown[i-1].At {
			rows = append(rows, []string{"at " + x.At})
		}
		from, _, _ := x.From.Round()
		to, _, _ := x.To.Round()
		rows = append(rows, []string{"  " + x.A + " / " + x.B, from + " → " + to, inErrors(x.Moved), signed(x.SigmaFrom) + " → " + signed(x.SigmaTo)})
	}
	if len(shown) > 0 {
		t.printf("\nTensions, ratios moved in units of the earlier error\n")
		layout.Table(&t.b, rows)
	}
	if hidden := len(moved) - len(shown); hidden > 0 {
		t.printf("  and %d that moved less: --json lists them\n", hidden)
	}
	if len(moved) == 0 && len(t.Tensions) > 0 {
		t.printf("No tension moved.\n")
	}
	t.together()
}

// together writes what became of the agreement of all and of their combined mass.
func (t *sinceText) together() {
	var lines []string
	for _, k := range t.Consistency {
		if k.SigmaFrom != k.SigmaTo || k.VerdictFrom != k.VerdictTo {
			verdict := k.VerdictTo
			if k.VerdictFrom != k.VerdictTo {
				verdict = k.VerdictFrom + " → " + strings.ToUpper(k.VerdictTo)
			}
			lines = append(lines, fmt.Sprintf("at %s: %s, %.1fσ → %.1fσ", k.At, verdict, k.SigmaFrom, k.SigmaTo))
		}
	}
	for _, m := range t.Combined {
		if m.From != m.To {
			lines = append(lines, fmt.Sprintf("at %s: combined mass %s → %s, moved %s", m.Inside, m.From.Scaled(t.unit), m.To.Scaled(t.unit), inErrors(m.Moved)))
		}
	}
	t.list("All together", lines)
}

// furthest keeps the moves that fit on a screen, in their order.
func furthest(moves []TensionMove) []TensionMove {
	if len(moves) <= most {
		return moves
	}
	order := make([]int, len(moves))
	for i := range order {
		order[i] = i
	}
	by := func(i int) float64 { return math.Abs(moves[i].SigmaTo - moves[i].SigmaFrom) }
	slices.SortStableFunc(order, func(i, j int) int { return cmp.Compare(by(j), by(i)) })
	order = order[:most]
	slices.Sort(order)
	var kept []TensionMove
	for _, i := range order {
		kept = append(kept, moves[i])
	}
	return kept
}

func (t *sinceText) failures() {
	var lines []string
	for _, f := range t.Failures {
		lines = append(lines, fmt.Sprintf("%s (%s): %s", f.Node, f.Where, f.Reason))
	}
	t.list("Failed", lines)
}

// inErrors writes a move in units of the error.
func inErrors(moved *float64) string {
	if moved == nil {
		return "?"
	}
	return signed(*moved)
}

// signed writes a number with its sign, and a zero without one.
func signed(x float64) string {
	if text := fmt.Sprintf("%+.1f", x); text != "+0.0" && text != "-0.0" {
		return text
	}
	return "0.0"
}

func exponent(unit float64) int {
	n := 0
	for ; unit >= 9.99; unit /= 10 {
		n++
	}
	return n
}

func short(digest string) string { return digest[:min(12, len(digest))] }
