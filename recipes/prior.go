package recipes

import (
	"fmt"
	"slices"

	"steelyard/probes/prior"
)

// priorArguments names the arguments of the functions that state a prior.
var priorArguments = map[string][]string{
	"normal":      {"mean", "sd"},
	"half_normal": {"sd"},
	"lognormal":   {"median", "sd_of_ln"},
	"uniform":     {"lo", "hi"},
	"loguniform":  {"lo", "hi"},
}

// functions lists every function of the language.
var functions = []string{"normal", "half_normal", "lognormal", "uniform", "loguniform", "column", "sky", "overdensity", "radius", "relation"}

// prior reads a number, a quantity with or without an error, or a prior
// function, and returns the unit it is in.
func (l *loader) prior(t term, m measure, name string) (p prior.Prior, unit string, ok bool) {
	if t.kind != callTerm {
		s, ok := l.scalar(t, m, name)
		if !ok {
			return p, "", false
		}
		if s.plus == 0 {
			return prior.Exact(s.value), s.unit, true
		}
		if s.plus == s.minus {
			p, err := prior.Normal(s.value, s.plus)
			return p, s.unit, l.possible(t, err)
		}
		p, err := prior.TwoPiece(s.value, s.minus, s.plus)
		return p, s.unit, l.possible(t, err)
	}
	arguments := priorArguments[t.name]
	if arguments == nil {
		l.notAPrior(t, name)
		return p, "", false
	}
	if !l.count(t, arguments, len(arguments)) {
		return p, "", false
	}
	values := make([]scalar, len(arguments))
	ok = true
	for i, argument := range arguments {
		as := m
		if argument == "sd_of_ln" {
			as = pure
		}
		var good bool
		values[i], good = l.exactScalar(t.items[i], as, fmt.Sprintf("%s in %s", argument, t.name))
		ok = ok && good
	}
	if !ok {
		return p, "", false
	}
	unit, ok = l.oneUnit(t, values, m)
	if !ok {
		return p, "", false
	}
	var err error
	a := values[0].value
	switch t.name {
	case "normal":
		p, err = prior.Normal(a, values[1].value)
	case "half_normal":
		p, err = prior.HalfNormal(a)
	case "lognormal":
		p, err = prior.LogNormal(a, values[1].value)
	case "uniform":
		p, err = prior.Uniform(a, values[1].value)
	case "loguniform":
		p, err = prior.LogUniform(a, values[1].value)
	}
	return p, unit, l.possible(t, err)
}

// oneUnit returns the unit that all values are in; a bare zero goes with any.
func (l *loader) oneUnit(t term, values []scalar, m measure) (unit string, ok bool) {
	for _, v := range values {
		if v.bare || v.unit == "" {
			continue
		}
		if unit != "" && v.unit != unit {
			l.add(problem{at: t.at, what: "an angle stands beside a length", write: "Write all of them as angles, or all as lengths."})
			return "", false
		}
		unit = v.unit
	}
	if unit == "" {
		unit = m.unit
	}
	return unit, true
}

// possible reports a prior that cannot be.
func (l *loader) possible(t term, err error) bool {
	if err != nil {
		l.add(problem{at: t.at, what: "no such distribution exists", why: sentence(err.Error())})
	}
	return err == nil
}

// count checks the number of arguments of a call: least of the names given at
// least, all of them at most.
func (l *loader) count(t term, names []string, least int) bool {
	if n := len(t.items); n < least || n > len(names) {
		write := t.name + "("
		for i, name := range names {
			if i > 0 {
				write += ", "
			}
			write += name
		}
		arguments := "arguments"
		if len(names) == 1 {
			arguments = "argument"
		}
		number := fmt.Sprint(len(names))
		if least < len(names) {
			number = fmt.Sprintf("%d or %d", least, len(names))
		}
		l.add(problem{at: t.at, what: fmt.Sprintf("%s takes %s %s, not %d", t.name, number, arguments, n), write: "Write " + write + ")."})
		return false
	}
	return true
}

// notAPrior reports a call of a function that states no prior.
func (l *loader) notAPrior(t term, name string) {
	if slices.Contains(functions, t.name) {
		l.add(problem{at: t.at, what: fmt.Sprintf("%s does not take %s", name, t.describe()), write: "Write a number, or a prior such as normal(mean, sd)."})
		return
	}
	l.unknownFunction(t, "normal", "half_normal", "lognormal", "uniform", "loguniform")
}

// unknownFunction reports a function that the language does not have; possible
// are those that could stand in its place.
func (l *loader) unknownFunction(t term, possible ...string) {
	write := didYouMean(t.name, possible, "%s(…)")
	l.add(problem{at: t.nameAt, what: fmt.Sprintf("there is no function %s", t.name), write: write})
}
