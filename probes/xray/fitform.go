package xray

import "math"

// A form is fitted to shells in coordinates in which every parameter is
// unbounded and has a normal prior. The priors are wide (common practice, no
// source): they only keep a parameter that the shells do not determine from
// running away, and the density beyond the last shell physical.

// coordinate is one fitted parameter of a form: its place in the form's
// parameters, its prior, and the map to the parameter itself.
type coordinate struct {
	index    int
	mean, sd float64
	bounded  float64 // 0: the parameter is eˣ; linear: it is x; else it is bounded/(1+e⁻ˣ)
}

// linear marks a coordinate that is the parameter itself.
const linear = -1

func (c coordinate) value(x float64) float64 {
	switch {
	case c.bounded == linear:
		return x
	case c.bounded > 0:
		return c.bounded / (1 + math.Exp(-x))
	}
	return math.Exp(x)
}

// derivative is that of value.
func (c coordinate) derivative(x float64) float64 {
	v := c.value(x)
	switch {
	case c.bounded == linear:
		return 1
	case c.bounded > 0:
		return v * (1 - v/c.bounded)
	}
	return v
}

// family is a form with the coordinates that are fitted; the rest stay as in
// base.
type family struct {
	form   Form
	words  string // for the reader
	base   []float64
	fitted []coordinate
	starts [][]float64 // first guesses
}

func (f *family) parameters(x []float64) []float64 {
	p := append([]float64(nil), f.base...)
	for i, c := range f.fitted {
		p[c.index] = c.value(x[i])
	}
	return p
}

// newFamily returns the family of a form for the shells, the modified β model
// with its first component alone.
func newFamily(form Form, shells *Bins) *family {
	n := shells.Len()
	first, last := shells.Outer[0], shells.Outer[n-1]
	middle, span := math.Log(math.Sqrt(first*last)), math.Log(last/first)
	n0 := math.Log(shells.Value[0])
	f := &family{form: form}
	for _, p := range form.parameters() {
		f.base = append(f.base, p.value)
	}
	add := func(index int, mean, sd, bounded float64) {
		f.fitted = append(f.fitted, coordinate{index, mean, sd, bounded})
	}
	// ln n0 within a factor 20 of the innermost shell, ln rc about the middle of
	// the range of radii, β = 0.6 within 40%.
	add(0, n0, 3, 0)
	add(1, middle, span/2, 0)
	add(2, math.Log(0.6), 0.35, 0)
	switch form {
	case Beta:
		f.words = "a β model (Cavaliere & Fusco-Femiano 1978)"
	case DoubleBeta:
		f.words = "a double β model (LaRoque et al. 2006)"
		add(3, n0-2, 3, 0)
		add(4, middle+span/4, span/2, 0)
		add(5, math.Log(0.6), 0.35, 0)
	case ModifiedBeta:
		f.words = "a modified β model (Vikhlinin et al. 2006)"
		// 0 < α < 3 and, as Vikhlinin et al. 2006 require, 0 < ε < 5; the radius
		// where the slope steepens is near the end of the data.
		add(3, -1, 1.5, 3)
		add(4, math.Log(last), 1, 0)
		add(5, -0.5, 1.2, 5)
	}
	for _, shift := range []float64{-0.25, 0, 0.25} {
		x := make([]float64, len(f.fitted))
		for i, c := range f.fitted {
			x[i] = c.mean
		}
		x[1] += shift * span
		f.starts = append(f.starts, x)
	}
	return f
}

// second adds the second component of the modified β model, a core of its own,
// starting from the best fit x without it.
func (f *family) second(x []float64, shells *Bins) *family {
	first, span := math.Log(shells.Outer[0]), math.Log(shells.Outer[shells.Len()-1]/shells.Outer[0])
	n0 := math.Log(shells.Value[0])
	two := &family{form: f.form, words: "a modified β model of two components (Vikhlinin et al. 2006)", base: f.base}
	two.fitted = append(append(two.fitted, f.fitted...),
		coordinate{index: 7, mean: n0, sd: 3}, coordinate{index: 8, mean: first + span/4, sd: span / 3}, coordinate{index: 9, mean: 0, sd: 0.3})
	for _, start := range [][2]float64{{-0.5, 0.15}, {-1.5, 0.4}, {-3, 0.6}} {
		two.starts = append(two.starts, append(append([]float64(nil), x...), n0+start[0], first+start[1]*span, 0))
	}
	return two
}

// formFit compares a family with data.
type formFit struct {
	*family
	data    *Bins
	predict func(p, out []float64) // what the data would be for the parameters p
}

// residuals fills out with (model − datum)/error of every bin, the side of the
// error chosen by the model, then with (x − mean)/sd of every coordinate:
// −½ Σ out² is the log posterior.
func (s *formFit) residuals(x, out []float64) {
	n := s.data.Len()
	s.predict(s.parameters(x), out[:n])
	for i, v := range s.data.Value {
		d := out[i] - v
		if d > 0 {
			out[i] = d / s.data.Plus[i]
		} else {
			out[i] = d / s.data.Minus[i]
		}
	}
	for i, c := range s.fitted {
		out[n+i] = (x[i] - c.mean) / c.sd
	}
}

func (s *formFit) size() int { return s.data.Len() + len(s.fitted) }
