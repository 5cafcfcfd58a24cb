package xray

import (
	"encoding/binary"
	"errors"
	"math"
)

// The outputs of the reductions are stored as bytes that are the same for the
// same values: a word that names the format, then every field in order, numbers
// as 64 little-endian bits and lists and words behind their length.

type encoder struct{ b []byte }

func (e *encoder) number(x float64) {
	if x == 0 {
		x = 0 // no negative zero
	}
	e.b = binary.LittleEndian.AppendUint64(e.b, math.Float64bits(x))
}

func (e *encoder) count(n int) { e.b = binary.LittleEndian.AppendUint64(e.b, uint64(n)) }

func (e *encoder) flag(b bool) {
	if b {
		e.count(1)
	} else {
		e.count(0)
	}
}

func (e *encoder) numbers(v []float64) {
	e.count(len(v))
	for _, x := range v {
		e.number(x)
	}
}

func (e *encoder) word(s string) {
	e.count(len(s))
	e.b = append(e.b, s...)
}

func (e *encoder) words(v []string) {
	e.count(len(v))
	for _, s := range v {
		e.word(s)
	}
}

// decoder reads what an encoder wrote. After the first fault it yields zeros.
type decoder struct {
	b   []byte
	bad bool
}

var errDamaged = errors.New("xray: the stored reduction is damaged or of another version")

func (d *decoder) take(n int) []byte {
	if d.bad || n < 0 || n > len(d.b) {
		d.bad = true
		return nil
	}
	out := d.b[:n]
	d.b = d.b[n:]
	return out
}

func (d *decoder) bits() uint64 {
	if b := d.take(8); b != nil {
		return binary.LittleEndian.Uint64(b)
	}
	return 0
}

// number reads a finite number; anything else is a fault.
func (d *decoder) number() float64 {
	x := math.Float64frombits(d.bits())
	if math.IsNaN(x) || math.IsInf(x, 0) || x == 0 && math.Signbit(x) {
		d.bad = true
		return 0
	}
	return x
}

// count reads a length; one that the bytes left cannot hold is a fault.
func (d *decoder) count() int {
	n := d.bits()
	if n > uint64(len(d.b)) {
		d.bad = true
		return 0
	}
	return int(n)
}

func (d *decoder) flag() bool {
	b := d.bits()
	d.bad = d.bad || b > 1
	return b == 1
}

func (d *decoder) numbers() []float64 {
	out := make([]float64, d.count())
	for i := range out {
		out[i] = d.number()
	}
	return out
}

func (d *decoder) word() string { return string(d.take(d.count())) }

func (d *decoder) words() []string {
	var out []string
	for range d.count() {
		out = append(out, d.word())
	}
	return out
}

// end reports whether everything was read and nothing is left.
func (d *decoder) end() error {
	if d.bad || len(d.b) > 0 {
		return errDamaged
	}
	return nil
}

const (
	gasFormat         = "steelyard/xray/density/2"
	temperatureFormat = "steelyard/xray/temperature/2"
)

// MarshalBinary returns the canonical bytes of the gas.
func (g *Gas) MarshalBinary() ([]byte, error) {
	var e encoder
	e.word(gasFormat)
	e.word(string(g.Form))
	e.numbers(g.Parameters)
	e.count(len(g.Moves))
	for _, m := range g.Moves {
		e.numbers(m)
	}
	e.number(g.Inner)
	e.number(g.Outer)
	e.word(g.Words)
	e.flag(g.Fitted)
	e.number(g.Chi2)
	e.count(g.Dof)
	e.words(g.Notes)
	return e.b, nil
}

// UnmarshalBinary reads what MarshalBinary wrote.
func (g *Gas) UnmarshalBinary(b []byte) error {
	d := decoder{b: b}
	if d.word() != gasFormat {
		return errDamaged
	}
	*g = Gas{Form: Form(d.word()), Parameters: d.numbers()}
	for range d.count() {
		g.Moves = append(g.Moves, d.numbers())
	}
	g.Inner, g.Outer = d.number(), d.number()
	g.Words = d.word()
	g.Fitted, g.Chi2, g.Dof = d.flag(), d.number(), int(d.bits())
	g.Notes = d.words()
	if err := d.end(); err != nil {
		return err
	}
	if len(g.Form.parameters()) == 0 || len(g.Parameters) != len(g.Form.parameters()) {
		return errDamaged
	}
	return nil
}

// MarshalBinary returns the canonical bytes of the temperatures.
func (s *Spectra) MarshalBinary() ([]byte, error) {
	var e encoder
	e.word(temperatureFormat)
	e.flag(s.Projected)
	for _, v := range [][]float64{s.Inner, s.Outer, s.Value, s.Minus, s.Plus} {
		e.numbers(v)
	}
	e.numbers(s.Mixing)
	e.words(s.Notes)
	return e.b, nil
}

// UnmarshalBinary reads what MarshalBinary wrote.
func (s *Spectra) UnmarshalBinary(b []byte) error {
	d := decoder{b: b}
	if d.word() != temperatureFormat {
		return errDamaged
	}
	*s = Spectra{Projected: d.flag()}
	s.Inner, s.Outer, s.Value, s.Minus, s.Plus = d.numbers(), d.numbers(), d.numbers(), d.numbers(), d.numbers()
	if mixing := d.numbers(); len(mixing) > 0 {
		s.Mixing = mixing
	}
	s.Notes = d.words()
	if err := d.end(); err != nil {
		return err
	}
	if n := len(s.Value); s.Mixing != nil && len(s.Mixing) != n*n {
		return errDamaged
	}
	for _, v := range [][]float64{s.Inner, s.Outer, s.Minus, s.Plus} {
		if len(v) != len(s.Value) {
			return errDamaged
		}
	}
	return nil
}
