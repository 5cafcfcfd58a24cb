package weighing

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"steelyard/engine/layout"
)

// verdict says in a paragraph whether the masses agree, who stands apart, where,
// by how much and how surely, and what that is conditional on.
func (t *text) verdict() {
	if len(t.w.Consistency) == 0 {
		return
	}
	worst := t.w.Consistency[0]
	var sigmas []string
	for _, c := range t.w.Consistency {
		if c.Sigma > worst.Sigma {
			worst = c
		}
		sigmas = append(sigmas, fmt.Sprintf("%s%.1fσ within %s", about(c.Tail), c.Sigma, t.at(c.At)))
	}
	does := "agree"
	if worst.Verdict != "consistent" {
		does = "do not agree"
	}
	t.printf("\n")
	t.wrap(fmt.Sprintf("%s: the %s masses %s, %s.", strings.ToUpper(worst.Verdict), count(len(worst.Of)), does, strings.Join(sigmas, ", ")))
	t.apart()
	t.driver(worst)
	if len(worst.Doubtful) > 0 {
		t.wrap(fmt.Sprintf("† Doubtful: %s.", strings.Join(worst.Doubtful, ", ")))
	}
	if len(worst.Given) > 0 {
		t.wrap(fmt.Sprintf("Given %s.", strings.Join(worst.Given, "; ")))
	}
}

// apart describes the pair that is furthest apart.
func (t *text) apart() {
	if len(t.w.Tensions) == 0 {
		return
	}
	x := slices.MaxFunc(t.w.Tensions, func(a, b Tension) int {
		switch {
		case math.Abs(a.Sigma) < math.Abs(b.Sigma):
			return -1
		case math.Abs(a.Sigma) > math.Abs(b.Sigma):
			return 1
		}
		return 0
	})
	line := fmt.Sprintf("Furthest apart: %s is %s times %s within %s, %s%.1fσ (p = %s",
		x.A, x.Ratio, x.B, t.at(x.At), about(x.Tail), math.Abs(x.Sigma), probability(x.PValue))
	if n := len(t.w.Tensions); n > 1 {
		line += fmt.Sprintf("; %s that any of these %d ratios is so by chance", probability(x.PFamily), n)
	}
	line += ")"
	for _, p := range t.w.Profiles {
		if p.A == x.A && p.B == x.B {
			line += fmt.Sprintf("; %s%.1fσ at all radii at once", about(p.Tail), p.Sigma)
		}
	}
	line += "."
	most := 0.0
	for _, other := range t.w.Tensions {
		most = max(most, other.RadiusLn)
	}
	if most > 0 {
		line += fmt.Sprintf(" The choice of radius, moved by its own error, changes no ratio by more than %.1f%%.", 100*math.Expm1(most))
	}
	t.wrap(line)
}

// driver says whose removal changes the verdict most, and the evidence.
func (t *text) driver(c Consistency) {
	var items []string
	least := ""
	for _, name := range c.Of {
		s, ok := c.Without[name]
		if !ok {
			continue
		}
		items = append(items, fmt.Sprintf("%.1fσ without %s", s, name))
		if least == "" || s < c.Without[least] {
			least = name
		}
	}
	line := ""
	switch {
	case least == "":
	case c.Verdict != "consistent" && c.Without[least] < c.Sigma/2:
		line = fmt.Sprintf("%s stands against the others: %s. ", least, strings.Join(items, ", "))
	default:
		line = fmt.Sprintf("Leaving one out: %s. ", strings.Join(items, ", "))
	}
	if e := c.Evidence; e != nil {
		favoured := "one mass for all over a mass for each"
		if e.LnBayes < 0 {
			favoured = "a mass for each over one mass for all"
		}
		line += fmt.Sprintf("The evidence favours %s by e^%.1f (%s).", favoured, math.Abs(e.LnBayes), e.Prior)
	}
	if line != "" {
		t.wrap(line)
	}
}

// levers says what would bring the pair that is furthest apart to one sigma.
func (t *text) levers() {
	if len(t.w.Levers) == 0 {
		return
	}
	first := t.w.Levers[0]
	t.printf("\n")
	layout.Wrap(&t.b, "", 2, fmt.Sprintf("What would bring %s and %s to 1σ within %s, the most plausible first", first.A, first.B, t.at(first.At)))
	rows := [][]string{{"", "now", "needed", "prior sd", "Δχ²", "then of all"}}
	cannot := map[string][]string{}
	var reasons []string
	for _, l := range t.w.Levers {
		if l.Value == nil {
			if cannot[l.Cannot] == nil {
				reasons = append(reasons, l.Cannot)
			}
			cannot[l.Cannot] = append(cannot[l.Cannot], l.Assumption)
			continue
		}
		unit := ""
		if l.Unit != "" {
			unit = " " + l.Unit
		}
		sd, approximately := "exact", ""
		if l.InPriorSD != nil {
			sd = fmt.Sprintf("%+.1f", *l.InPriorSD)
		}
		if l.Interpolated {
			approximately = "≈"
		}
		rows = append(rows, []string{l.Assumption, fmt.Sprintf("%.3g%s", l.Present, unit), fmt.Sprintf("%s%.3g%s", approximately, *l.Value, unit),
			sd, fmt.Sprintf("%+.1f", *l.Chi2), fmt.Sprintf("%.1fσ", *l.All)})
	}
	if len(rows) > 1 {
		t.table(rows)
	}
	for _, reason := range reasons {
		t.wrap(fmt.Sprintf("Cannot: %s (%s)", strings.Join(cannot[reason], ", "), reason))
	}
}

// sensitivity says how the masses change with less data.
func (t *text) sensitivity() {
	if len(t.w.Sensitivity) == 0 {
		return
	}
	t.printf("\nWith less data (change of the mass, in its own errors)\n")
	head, index := []string{""}, map[string]int{}
	rows := [][]string{head}
	for _, s := range t.w.Sensitivity {
		name := s.Estimate + " " + s.Change
		if _, ok := index[name]; !ok {
			index[name] = len(rows)
			rows = append(rows, []string{name})
		}
		row := append(rows[index[name]], fmt.Sprintf("%+.0f%%", 100*math.Expm1(s.LnChange)), fmt.Sprintf("%+.1fσ", s.InSD))
		rows[index[name]] = row
		if len(row) > len(rows[0]) {
			rows[0] = append(rows[0], fmt.Sprintf("within %.0f kpc", s.Radius), "")
		}
	}
	t.table(rows)
}

// count writes a small number in words.
func count(n int) string {
	words := []string{"no", "one", "two", "three", "four", "five", "six", "seven", "eight", "nine"}
	if n < len(words) {
		return words[n]
	}
	return fmt.Sprint(n)
}
