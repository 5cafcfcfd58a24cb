package recipes

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"steelyard/probes/method"
	"steelyard/probes/prior"
	"steelyard/probes/units"
)

// value reads the value of a setting. When it returns false the mistake has
// been reported.
func (l *loader) value(t term, s method.Setting) (v method.Value, ok bool) {
	if t.kind == badTerm {
		return v, false
	}
	v.Set = true
	m := measure{s.Unit, s.Length}
	switch s.Kind {
	case method.Number:
		ok = l.assumption(t, s, &v)
	case method.Exact:
		var x scalar
		if x, ok = l.exactScalar(t, m, s.Name); ok {
			v.Prior, v.Unit = prior.Exact(x.value), x.unit
			ok = l.permitted(t, s, v)
		}
	case method.Measured:
		ok = l.measured(t, s, &v)
	case method.Integer:
		ok = l.integer(t, s, &v)
	case method.Choice:
		v.Text, ok = l.choice(t, s)
	case method.Choices:
		v.List, ok = l.choices(t, s)
	case method.Span, method.List:
		ok = l.numbers(t, s, &v)
	case method.Flag:
		if ok = t.kind == flagTerm; !ok {
			l.add(problem{at: t.at, what: fmt.Sprintf("%s is true or false, not %s", s.Name, t.describe()), write: fmt.Sprintf("Write %s = true or %s = false, without quotes.", s.Name, s.Name)})
		}
		v.Flag = t.flag
	case method.Text:
		v.Text, ok = l.plainText(t, s.Name)
	case method.Overdensity:
		ok = l.overdensity(t, s, &v)
	}
	return v, ok
}

// assumption reads a number, a prior, a reference to a nuisance or a relation.
func (l *loader) assumption(t term, s method.Setting, v *method.Value) (ok bool) {
	m := measure{s.Unit, s.Length}
	switch {
	case t.is("relation"):
		v.Relation, ok = l.relation(t, s)
		v.Unit = s.Unit
		return ok
	case t.kind == referenceTerm && t.path[0] == "nuisance":
		n := l.nuisance(t)
		if n == nil {
			return false
		}
		if _, fits := m.fits(units.MustParse(n.Unit)); !fits {
			l.add(problem{at: t.at, what: fmt.Sprintf("%s is %s, and nuisance.%s is %s", s.Name, m.describe(), n.Name, withArticle(units.MustParse(n.Unit).Describe())),
				why: fmt.Sprintf("The nuisance is declared at %s.", l.where(n.Range))})
			return false
		}
		// The same prior, in this setting's unit.
		if v.Prior, v.Unit, ok = l.prior(l.nuisanceTerms[n.Name], m, s.Name); !ok {
			return false
		}
		v.Nuisance = n.Name
	default:
		if v.Prior, v.Unit, ok = l.prior(t, m, s.Name); !ok {
			return false
		}
	}
	return l.permitted(t, s, *v)
}

// relation reads relation("duffy-2008").
func (l *loader) relation(t term, s method.Setting) (string, bool) {
	if len(s.Relation) == 0 {
		l.add(problem{at: t.at, what: fmt.Sprintf("no published relation is known for %s", s.Name), write: "Write a number, or a prior such as normal(mean, sd)."})
		return "", false
	}
	if !l.count(t, []string{"\"name\""}, 1) {
		return "", false
	}
	return l.oneOf(t.items[0], "a relation for "+s.Name, s.Relation, s.Planned)
}

// measured reads a quantity whose error belongs to it. One that must be given
// must have its error, for a mass or a dispersion without one would pass for
// perfectly known; one that may be left out (a parameter of a published model)
// may also be quoted without.
func (l *loader) measured(t term, s method.Setting, v *method.Value) (ok bool) {
	m := measure{s.Unit, s.Length}
	if t.kind == referenceTerm && t.path[0] == "nuisance" {
		l.add(problem{at: t.at, what: fmt.Sprintf("%s is measured: it cannot be a nuisance", s.Name), write: "Write the value with its error, like " + m.measuredExample() + "."})
		return false
	}
	if v.Prior, v.Unit, ok = l.prior(t, m, s.Name); !ok {
		return false
	}
	if s.Required && v.Prior.IsExact() {
		l.add(problem{at: t.at, what: fmt.Sprintf("%s needs its error", s.Name), write: "Write it like " + m.measuredExample() + "; two errors are written +0.9 -0.8."})
		return false
	}
	return l.permitted(t, s, *v)
}

// measuredExample is example with an error.
func (m measure) measuredExample() string {
	if text, ok := measuredExamples[standard(units.MustParse(m.unit))]; ok {
		return strconv.Quote(text)
	}
	return strconv.Quote(strings.TrimSpace("0.30 +- 0.02 " + m.unit))
}

// permitted checks the range of a value, of a prior its median.
func (l *loader) permitted(t term, s method.Setting, v method.Value) bool {
	if s.Low == 0 && s.High == 0 {
		return true
	}
	low, high := s.Low, s.High
	if v.Unit != s.Unit { // an angle for a length: only the sign can be told
		low, high = math.Inf(-1), math.Inf(1)
		if s.Low >= 0 {
			low = 0
		}
	}
	x := v.Prior.Median()
	if low <= x && x <= high {
		return true
	}
	unit := s.Unit
	if unit != "" {
		unit = " " + unit
	}
	what := fmt.Sprintf("%s is out of range", s.Name)
	limits := fmt.Sprintf("It lies between %s and %s%s", short(s.Low), short(s.High), unit)
	switch {
	case v.Unit != s.Unit:
		l.add(problem{at: t.at, what: what, why: "It is not negative."})
		return false
	case math.IsInf(s.High, 1):
		limits = fmt.Sprintf("It is at least %s%s", short(s.Low), unit)
	case math.IsInf(s.Low, -1):
		limits = fmt.Sprintf("It is at most %s%s", short(s.High), unit)
	}
	of := "the value"
	if !v.Prior.IsExact() && s.Kind != method.Measured {
		of = "the median of the prior"
	}
	l.add(problem{at: t.at, what: what, why: fmt.Sprintf("%s; %s here is %s%s.", limits, of, short(x), unit)})
	return false
}

// short writes a number for messages.
func short(x float64) string { return strconv.FormatFloat(x, 'g', 6, 64) }

func (l *loader) integer(t term, s method.Setting, v *method.Value) bool {
	if t.kind != numberTerm || !t.number.IsInt() || !t.number.Num().IsInt64() {
		l.add(problem{at: t.at, what: fmt.Sprintf("%s is a whole number", s.Name), write: "Write it like " + sample(s) + ", without quotes."})
		return false
	}
	if n := t.number.Num().Int64(); n > 1<<53 || n < -1<<53 {
		l.fail(t.at, "%s is too large", s.Name)
		return false
	}
	v.Prior = prior.Exact(float(t.number))
	return l.permitted(t, s, *v)
}

// choice reads one word out of the setting's choices.
func (l *loader) choice(t term, s method.Setting) (string, bool) {
	return l.oneOf(t, s.Name, s.Choices, s.Planned)
}

// oneOf reads a text that must be one of the words.
func (l *loader) oneOf(t term, name string, words, planned []string) (string, bool) {
	if t.kind != textTerm {
		p := problem{at: t.at, what: fmt.Sprintf("%s is a word in quotes", name), write: "Possible here: " + enumerate(words, "%q", "or") + "."}
		if word := strings.ReplaceAll(l.written(t.at), " ", ""); t.kind == referenceTerm && slices.Contains(words, word) {
			p.write = fmt.Sprintf("Write %q.", word)
		}
		l.add(p)
		return "", false
	}
	if slices.Contains(words, t.text) {
		return t.text, true
	}
	p := problem{at: t.at, what: fmt.Sprintf("%q is not %s", t.text, choiceName(name)), write: didYouMean(t.text, words, "%q")}
	if slices.Contains(planned, t.text) {
		p.what = fmt.Sprintf("%q is not built yet", t.text)
		p.write = "Possible for now: " + enumerate(words, "%q", "or") + "."
		if len(words) == 0 {
			p.write = ""
		}
	}
	l.add(p)
	return "", false
}

// choiceName words "… is not a value of halo" and "… is not a relation for …".
func choiceName(name string) string {
	if strings.Contains(name, " ") {
		return name
	}
	return "a value of " + name
}

func (l *loader) choices(t term, s method.Setting) (list []string, ok bool) {
	if t.kind != listTerm || len(t.items) == 0 {
		l.add(problem{at: t.at, what: fmt.Sprintf("%s is a list of words", s.Name), write: fmt.Sprintf("Write it like %s = [%s].", s.Name, enumerateList(s.Choices))})
		return nil, false
	}
	ok = true
	for _, item := range t.items {
		if item.kind == badTerm {
			ok = false
			continue
		}
		word, good := l.oneOf(item, s.Name, s.Choices, s.Planned)
		if good && slices.Contains(list, word) {
			l.fail(item.at, "%q stands twice in %s", word, s.Name)
			good = false
		}
		ok = ok && good
		list = append(list, word)
	}
	return list, ok
}

// enumerateList writes words as a list in a recipe.
func enumerateList(words []string) string {
	quoted := make([]string, len(words))
	for i, w := range words {
		quoted[i] = strconv.Quote(w)
	}
	return strings.Join(quoted, ", ")
}

// numbers reads a span of two quantities or a rising list.
func (l *loader) numbers(t term, s method.Setting, v *method.Value) bool {
	m := measure{s.Unit, s.Length}
	form := fmt.Sprintf("%s = [%s, …]", s.Name, m.example())
	if s.Kind == method.Span {
		form = fmt.Sprintf("%s = [lower, upper]", s.Name)
	}
	if t.kind != listTerm || len(t.items) == 0 || s.Kind == method.Span && len(t.items) != 2 {
		what := fmt.Sprintf("%s is a list in brackets", s.Name)
		if s.Kind == method.Span {
			what = fmt.Sprintf("%s is a lower and an upper limit in brackets", s.Name)
		}
		l.add(problem{at: t.at, what: what, write: fmt.Sprintf("Write %s, each like %s.", form, m.example())})
		return false
	}
	ok := true
	var all []scalar
	for _, item := range t.items {
		x, good := l.exactScalar(item, m, s.Name)
		if good {
			good = l.permitted(item, s, method.Value{Prior: prior.Exact(x.value), Unit: x.unit})
		}
		ok = ok && good
		all = append(all, x)
	}
	if !ok {
		return false
	}
	if v.Unit, ok = l.oneUnit(t, all, m); !ok {
		return false
	}
	for i, x := range all {
		if i > 0 && x.value <= all[i-1].value {
			l.fail(t.items[i].at, "the numbers of %s must rise", s.Name)
			return false
		}
		v.Numbers = append(v.Numbers, x.value)
	}
	return true
}

// plainText reads a text.
func (l *loader) plainText(t term, name string) (string, bool) {
	if t.kind != textTerm {
		if t.kind != badTerm {
			l.add(problem{at: t.at, what: fmt.Sprintf("%s is a text in quotes", name), write: fmt.Sprintf("Write it like %s = \"…\".", name)})
		}
		return "", false
	}
	return t.text, true
}
