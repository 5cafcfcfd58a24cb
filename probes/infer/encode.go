package infer

import (
	"encoding/binary"
	"errors"
	"fmt"
	"math"
)

// format is the first line of encoded draws; another version has another line.
const format = "steelyard draws 1\n"

// MarshalBinary encodes the draws. Equal draws give equal bytes (−0 is written
// as 0, a nil and an empty list alike), and draws that do not Validate are
// refused.
//
// After the line "steelyard draws 1\n" come, little-endian: counts, lengths and
// integers as uint32; numbers as IEEE 754 float64; strings as length and UTF-8
// bytes; lists as count and items; flags as one byte, 0 or 1. In order: N;
// Radii; LnMass; Parameters (name, unit, values); Nuisances likewise; Covers
// (two numbers); Assumes; Quality, field by field; Checks (name, statistic,
// p-value, passed, note); Warnings.
func (d *Draws) MarshalBinary() ([]byte, error) {
	if err := d.Validate(); err != nil {
		return nil, err
	}
	e := encoder(make([]byte, 0, len(format)+8*len(d.LnMass)+8*d.N*(len(d.Parameters)+len(d.Nuisances))+1024))
	e = append(e, format...)
	e.integer(d.N)
	e.numbers(d.Radii)
	e.numbers(d.LnMass)
	for _, set := range [][]Parameter{d.Parameters, d.Nuisances} {
		e.integer(len(set))
		for _, p := range set {
			e.text(p.Name)
			e.text(p.Unit)
			e.numbers(p.Values)
		}
	}
	e.number(d.Covers[0])
	e.number(d.Covers[1])
	e.texts(d.Assumes)
	q := d.Quality
	e.flag(q.Converged)
	e.text(q.Sampler)
	e.number(q.EffectiveDraws)
	e.number(q.TailShape)
	e.integer(q.Evaluations)
	e.integer(q.Modes)
	e.number(q.LogEvidence)
	e.number(q.EvidenceError)
	e.flag(q.HasEvidence)
	e.number(q.RHat)
	e.number(q.Chi2)
	e.integer(q.Dof)
	e.number(q.PValue)
	e.integer(len(d.Checks))
	for _, c := range d.Checks {
		e.text(c.Name)
		e.number(c.Statistic)
		e.number(c.PValue)
		e.flag(c.Passed)
		e.text(c.Note)
	}
	e.texts(d.Warnings)
	return e, nil
}

// UnmarshalBinary decodes what MarshalBinary wrote and nothing else: a byte too
// many or too few, a number that is not finite, a count beyond the data or any
// other spelling of the same draws is an error, and d is then unchanged.
func (d *Draws) UnmarshalBinary(data []byte) error {
	if len(data) < len(format) || string(data[:len(format)]) != format {
		return errors.New("infer: these bytes are not draws of a version this program reads")
	}
	r := &decoder{left: data[len(format):]}
	var got Draws
	got.N = r.integer()
	got.Radii = r.numbers()
	got.LnMass = r.numbers()
	for _, set := range []*[]Parameter{&got.Parameters, &got.Nuisances} {
		for n := r.count(12); n > 0 && r.err == nil; n-- {
			*set = append(*set, Parameter{Name: r.text(), Unit: r.text(), Values: r.numbers()})
		}
	}
	got.Covers = [2]float64{r.number(), r.number()}
	got.Assumes = r.texts()
	got.Quality = Quality{
		Converged: r.flag(), Sampler: r.text(), EffectiveDraws: r.number(), TailShape: r.number(),
		Evaluations: r.integer(), Modes: r.integer(), LogEvidence: r.number(), EvidenceError: r.number(), HasEvidence: r.flag(),
		RHat: r.number(), Chi2: r.number(), Dof: r.integer(), PValue: r.number(),
	}
	for n := r.count(25); n > 0 && r.err == nil; n-- {
		got.Checks = append(got.Checks, Check{Name: r.text(), Statistic: r.number(), PValue: r.number(), Passed: r.flag(), Note: r.text()})
	}
	got.Warnings = r.texts()
	if r.err == nil && len(r.left) > 0 {
		r.err = fmt.Errorf("infer: %d bytes follow the draws", len(r.left))
	}
	if r.err == nil {
		r.err = got.Validate()
	}
	if r.err == nil {
		*d = got
	}
	return r.err
}

// Validate reports the first thing about d that cannot be: no draws, columns
// of another length than N, radii that do not rise, a name missing or used
// twice, or a number that is not finite.
func (d *Draws) Validate() error {
	if d.N < 1 || d.N > math.MaxInt32 {
		return fmt.Errorf("infer: %d draws", d.N)
	}
	for j, r := range d.Radii {
		if !(r > 0) || math.IsInf(r, 1) || j > 0 && r <= d.Radii[j-1] {
			return fmt.Errorf("infer: the radii must be positive and rise, but number %d is %g kpc", j+1, r)
		}
	}
	if len(d.LnMass) != d.N*len(d.Radii) {
		return fmt.Errorf("infer: %d masses for %d draws at %d radii", len(d.LnMass), d.N, len(d.Radii))
	}
	for i, v := range d.LnMass {
		if !finite(v) {
			return fmt.Errorf("infer: ln M of draw %d at %.4g kpc is %v", i/len(d.Radii)+1, d.Radii[i%len(d.Radii)], v)
		}
	}
	for _, set := range [][]Parameter{d.Parameters, d.Nuisances} {
		seen := map[string]bool{}
		for _, p := range set {
			switch {
			case p.Name == "":
				return errors.New("infer: a column of draws has no name")
			case seen[p.Name]:
				return fmt.Errorf("infer: two columns of draws are called %s", p.Name)
			case len(p.Values) != d.N:
				return fmt.Errorf("infer: %d values of %s for %d draws", len(p.Values), p.Name, d.N)
			}
			seen[p.Name] = true
			for i, v := range p.Values {
				if !finite(v) {
					return fmt.Errorf("infer: %s of draw %d is %v", p.Name, i+1, v)
				}
			}
		}
	}
	if !finite(d.Covers[0]) || !finite(d.Covers[1]) || d.Covers[0] > d.Covers[1] {
		return fmt.Errorf("infer: the data cannot cover %g to %g kpc", d.Covers[0], d.Covers[1])
	}
	q := d.Quality
	for _, n := range []struct {
		name  string
		value float64
	}{
		{"effective draws", q.EffectiveDraws}, {"tail shape", q.TailShape}, {"log evidence", q.LogEvidence}, {"error of the log evidence", q.EvidenceError},
		{"split R̂", q.RHat}, {"χ²", q.Chi2}, {"p-value", q.PValue},
	} {
		if !finite(n.value) {
			return fmt.Errorf("infer: the %s is %v", n.name, n.value)
		}
	}
	for _, n := range []int{q.Evaluations, q.Modes, q.Dof} {
		if n < 0 || n > math.MaxInt32 {
			return fmt.Errorf("infer: a count of the quality is %d", n)
		}
	}
	for _, c := range d.Checks {
		if !finite(c.Statistic) || !finite(c.PValue) {
			return fmt.Errorf("infer: the check %q has statistic %v and p-value %v", c.Name, c.Statistic, c.PValue)
		}
	}
	return nil
}

func finite(v float64) bool { return !math.IsNaN(v) && !math.IsInf(v, 0) }

// encoder collects the encoded bytes.
type encoder []byte

func (e *encoder) integer(n int) { *e = binary.LittleEndian.AppendUint32(*e, uint32(n)) }

func (e *encoder) number(v float64) {
	if v == 0 {
		v = 0 // −0 too
	}
	*e = binary.LittleEndian.AppendUint64(*e, math.Float64bits(v))
}

func (e *encoder) flag(b bool) {
	v := byte(0)
	if b {
		v = 1
	}
	*e = append(*e, v)
}

func (e *encoder) text(s string) {
	e.integer(len(s))
	*e = append(*e, s...)
}

func (e *encoder) numbers(v []float64) {
	e.integer(len(v))
	for _, x := range v {
		e.number(x)
	}
}

func (e *encoder) texts(v []string) {
	e.integer(len(v))
	for _, s := range v {
		e.text(s)
	}
}

// decoder reads the encoded bytes; after an error everything reads as zero.
type decoder struct {
	left []byte
	err  error
}

func (r *decoder) take(n int) []byte {
	if r.err == nil && n > len(r.left) {
		r.err = errors.New("infer: the draws break off")
	}
	if r.err != nil {
		return nil
	}
	b := r.left[:n]
	r.left = r.left[n:]
	return b
}

func (r *decoder) integer() int {
	b := r.take(4)
	if b == nil {
		return 0
	}
	n := binary.LittleEndian.Uint32(b)
	if n > math.MaxInt32 && r.err == nil {
		r.err = fmt.Errorf("infer: a count of %d", n)
		return 0
	}
	return int(n)
}

// count reads the number of items of at least size bytes each, so that nothing
// is allocated for items that are not there.
func (r *decoder) count(size int) int {
	n := r.integer()
	if r.err == nil && n > len(r.left)/size {
		r.err = fmt.Errorf("infer: the draws break off: %d items announced in %d bytes", n, len(r.left))
		return 0
	}
	return n
}

func (r *decoder) number() float64 {
	b := r.take(8)
	if b == nil {
		return 0
	}
	bits := binary.LittleEndian.Uint64(b)
	if bits == 1<<63 && r.err == nil {
		r.err = errors.New("infer: a negative zero, which draws are never written with")
	}
	return math.Float64frombits(bits)
}

func (r *decoder) flag() bool {
	b := r.take(1)
	if b == nil {
		return false
	}
	if b[0] > 1 && r.err == nil {
		r.err = fmt.Errorf("infer: a flag of %d", b[0])
	}
	return b[0] == 1
}

func (r *decoder) text() string { return string(r.take(r.count(1))) }

func (r *decoder) numbers() []float64 {
	n := r.count(8)
	if n == 0 {
		return nil
	}
	out := make([]float64, n)
	for i := range out {
		out[i] = r.number()
	}
	return out
}

func (r *decoder) texts() []string {
	var out []string
	for n := r.count(4); n > 0 && r.err == nil; n-- {
		out = append(out, r.text())
	}
	return out
}
