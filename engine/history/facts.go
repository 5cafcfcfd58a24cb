package history

import (
	"math"
	"regexp"
	"strconv"
	"strings"
)

// Fact is one thing that a node's output depends on, written for people: a
// value in the words of the recipe, not in those of the key.
type Fact struct {
	Name  string `json:"name"`
	Value string `json:"value"`
}

// parameters reads the parameters out of a key transcript. A block that is
// merely there is not among them.
func parameters(transcript string) []Fact {
	facts := []Fact{}
	for line := range strings.Lines(transcript) {
		quoted, ok := strings.CutPrefix(strings.TrimSuffix(line, "\n"), "param ")
		if !ok {
			continue
		}
		param, err := strconv.Unquote(quoted)
		if err != nil {
			continue
		}
		name, value, _ := strings.Cut(param, " = ")
		if value != "present" {
			facts = append(facts, Fact{name, readable(name, value)})
		}
	}
	return facts
}

// readable writes the value of a parameter for people. One of a form not known
// here stays as it is.
func readable(name, value string) string {
	base, _, numbered := strings.Cut(name, " (")
	if !numbered {
		base = name
	}
	words := strings.Fields(value)
	switch {
	case strings.HasSuffix(base, "cosmology") && len(words) == 6:
		return background(words)
	case base == "centre" && len(words) == 2:
		return degrees(words[0]) + ", " + degrees(words[1])
	case strings.HasPrefix(base, "column."):
		return column(value)
	case base == "own" && len(words) == 2:
		return "overdensity " + overdensity(words[0], words[1])
	case base == "at" && len(words) == 3 && words[2] != `""`:
		return "overdensity " + overdensity(words[1], words[2])
	case base == "at" && len(words) == 3:
		return "radius " + words[0] + " kpc"
	}
	if text, ok := setting(value); ok {
		return text
	}
	return strings.Join(unquoted(value), " ")
}

// readablePair writes what a parameter was and what it is. A flag that is off
// leaves no mark in the key but a zero.
func readablePair(name, from, to string) (string, string) {
	before, now := readable(name, from), readable(name, to)
	if before == "true" && now == "0" {
		now = "false"
	}
	if before == "0" && now == "true" {
		before = "false"
	}
	return before, now
}

func background(p []string) string {
	text := "H0 " + p[0] + " km/s/Mpc, Ωm " + p[1] + ", ΩΛ " + p[2]
	if p[3] != "-1" || p[4] != "0" {
		text += ", w0 " + p[3] + ", wa " + p[4]
	}
	if p[5] != "0" {
		text += ", T_CMB " + p[5] + " K"
	}
	return text
}

func degrees(radians string) string {
	x, err := strconv.ParseFloat(radians, 64)
	if err != nil {
		return radians
	}
	return strconv.FormatFloat(x*180/math.Pi, 'f', 5, 64) + " deg"
}

func overdensity(delta, of string) string {
	switch of {
	case `"virial"`:
		return "virial"
	case `"critical"`:
		return delta
	}
	return delta + " " + strings.Trim(of, `"`)
}

// column writes `"r_in" unit "arcmin" as "kpc" length true text false`.
func column(value string) string {
	name, rest, ok := quotedPrefix(value)
	if !ok {
		return value
	}
	if unit, _, ok := quotedPrefix(strings.TrimPrefix(rest, " unit ")); ok && unit != "" {
		return name + " in " + unit
	}
	return name
}

func quotedPrefix(s string) (text, rest string, ok bool) {
	quoted, err := strconv.QuotedPrefix(s)
	if err != nil {
		return "", s, false
	}
	text, err = strconv.Unquote(quoted)
	return text, s[len(quoted):], err == nil
}

// unquoted splits a value at its spaces, quotes taken off.
func unquoted(value string) (words []string) {
	for rest := strings.TrimSpace(value); rest != ""; rest = strings.TrimSpace(rest) {
		word, after, ok := quotedPrefix(rest)
		if !ok {
			word, after, _ = strings.Cut(rest, " ")
		}
		words, rest = append(words, word), after
	}
	return words
}

// setting writes the value of a setting, which a key has as its distribution
// and whatever else is set: `normal(1, 0.04, 0) nuisance "x"`.
func setting(value string) (string, bool) {
	m := settingForm.FindStringSubmatch(value)
	if m == nil {
		return "", false
	}
	var numbers, list []string
	var word, nuisance, unit string
	rest := strings.TrimSpace(m[5])
	for rest != "" {
		name, after, _ := strings.Cut(rest, " ")
		text, tail, ok := quotedPrefix(after)
		switch {
		case name == "flag":
			word, rest = "true", after
		case name == "list":
			list, rest = unquoted(strings.Trim(after, "[]")), ""
		case name == "numbers":
			numbers, rest = strings.Fields(after), ""
		case !ok:
			return "", false
		default:
			switch name {
			case "nuisance":
				nuisance = text
			case "unit":
				unit = text
			case "relation":
				word = "relation " + text
			default:
				word = text
			}
			rest = strings.TrimSpace(tail)
		}
	}
	kind, args := m[1], m[2:5]
	if unit == "rad" {
		unit = "arcsec"
		args[0] = arcsec(args[0])
		if kind != "lognormal" { // whose width is a pure number
			args[1], args[2] = arcsec(args[1]), arcsec(args[2])
		}
		for i := range numbers {
			numbers[i] = arcsec(numbers[i])
		}
	}
	text := distribution(kind, args)
	switch {
	case list != nil:
		text = strings.Join(list, ", ")
	case numbers != nil:
		text = strings.Join(numbers, ", ")
	case word != "" && kind == "exact" && m[2] == "0":
		text, unit = word, ""
	case word == "critical": // what an overdensity is of, unless it says otherwise
	case word != "":
		text += " " + word
	}
	if unit != "" {
		text += " " + unit
	}
	if nuisance != "" {
		text += " (nuisance." + nuisance + ")"
	}
	return text, true
}

var settingForm = regexp.MustCompile(`^([a-z_]+)\(([^,()]*), ([^,()]*), ([^,()]*)\)(.*)$`)

// distribution writes as many of a distribution's numbers as it has.
func distribution(kind string, args []string) string {
	switch kind {
	case "exact":
		return args[0]
	case "two_piece": // median, lower and upper error
		return args[0] + " +" + args[2] + " -" + args[1]
	case "half_normal":
		return kind + "(" + args[0] + ")"
	}
	return kind + "(" + args[0] + ", " + args[1] + ")"
}

func arcsec(radians string) string {
	x, err := strconv.ParseFloat(radians, 64)
	if err != nil {
		return radians
	}
	return strconv.FormatFloat(x*180/math.Pi*3600, 'g', 6, 64)
}
