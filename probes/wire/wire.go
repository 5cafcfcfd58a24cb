// Package wire writes and reads the bytes in which nodes hand their results to
// each other. Equal values give equal bytes, and nothing but what an Encoder
// wrote is read back: a stored result is either whole or refused.
//
// Every encoding begins with a line that names what it is and its version.
// Behind it, little-endian: counts and integers as uint32; numbers as IEEE 754
// float64 with −0 written as 0; texts as their length and bytes; lists as their
// count and items; flags as one byte, 0 or 1.
package wire

import (
	"encoding/binary"
	"errors"
	"fmt"
	"math"
)

// Encoder collects encoded bytes.
type Encoder []byte

// NewEncoder begins an encoding with the line that names it; size is a guess of
// its length.
func NewEncoder(format string, size int) *Encoder {
	e := Encoder(make([]byte, 0, len(format)+1+size))
	e = append(append(e, format...), '\n')
	return &e
}

// Int writes an integer between 0 and 2³¹−1.
func (e *Encoder) Int(n int) {
	if n < 0 || n > math.MaxInt32 {
		panic(fmt.Sprintf("wire: the integer %d cannot be written", n))
	}
	*e = binary.LittleEndian.AppendUint32(*e, uint32(n))
}

// Float writes a number.
func (e *Encoder) Float(v float64) {
	if v == 0 {
		v = 0 // −0 too
	}
	*e = binary.LittleEndian.AppendUint64(*e, math.Float64bits(v))
}

// Flag writes a truth value.
func (e *Encoder) Flag(b bool) {
	if b {
		*e = append(*e, 1)
	} else {
		*e = append(*e, 0)
	}
}

// Text writes a string.
func (e *Encoder) Text(s string) {
	e.Int(len(s))
	*e = append(*e, s...)
}

// Floats writes a list of numbers.
func (e *Encoder) Floats(v []float64) {
	e.Int(len(v))
	for _, x := range v {
		e.Float(x)
	}
}

// Ints writes a list of integers.
func (e *Encoder) Ints(v []int) {
	e.Int(len(v))
	for _, x := range v {
		e.Int(x)
	}
}

// Texts writes a list of strings.
func (e *Encoder) Texts(v []string) {
	e.Int(len(v))
	for _, s := range v {
		e.Text(s)
	}
}

// Decoder reads encoded bytes. After an error everything reads as zero; Close
// tells.
type Decoder struct {
	left []byte
	err  error
}

// NewDecoder begins to read an encoding of the given name.
func NewDecoder(format string, data []byte) *Decoder {
	d := &Decoder{left: data}
	if line := string(d.take(len(format) + 1)); line != format+"\n" {
		d.err = fmt.Errorf("these bytes are not %q as this program reads it", format)
	}
	return d
}

// Close returns the first error, or one when bytes are left over.
func (d *Decoder) Close() error {
	if d.err == nil && len(d.left) > 0 {
		d.err = fmt.Errorf("%d bytes too many", len(d.left))
	}
	return d.err
}

// Failed reports whether something could not be read.
func (d *Decoder) Failed() bool { return d.err != nil }

func (d *Decoder) fail(err error) {
	if d.err == nil {
		d.err = err
	}
}

func (d *Decoder) take(n int) []byte {
	if d.err == nil && n > len(d.left) {
		d.err = errors.New("the bytes break off")
	}
	if d.err != nil {
		return nil
	}
	b := d.left[:n]
	d.left = d.left[n:]
	return b
}

// Int reads an integer.
func (d *Decoder) Int() int {
	b := d.take(4)
	if b == nil {
		return 0
	}
	n := binary.LittleEndian.Uint32(b)
	if n > math.MaxInt32 {
		d.fail(fmt.Errorf("an integer of %d", n))
		return 0
	}
	return int(n)
}

// Count reads the number of items that follow, each of at least size bytes, so
// that nothing is allocated for items that are not there.
func (d *Decoder) Count(size int) int {
	n := d.Int()
	if d.err == nil && n > len(d.left)/size {
		d.fail(fmt.Errorf("%d items announced in %d bytes", n, len(d.left)))
		return 0
	}
	return n
}

// Float reads a number.
func (d *Decoder) Float() float64 {
	b := d.take(8)
	if b == nil {
		return 0
	}
	bits := binary.LittleEndian.Uint64(b)
	if bits == 1<<63 {
		d.fail(errors.New("a negative zero, which is never written"))
	}
	return math.Float64frombits(bits)
}

// Flag reads a truth value.
func (d *Decoder) Flag() bool {
	b := d.take(1)
	if b == nil {
		return false
	}
	if b[0] > 1 {
		d.fail(fmt.Errorf("a flag of %d", b[0]))
	}
	return b[0] == 1
}

// Text reads a string.
func (d *Decoder) Text() string { return string(d.take(d.Count(1))) }

// Floats reads a list of numbers; an empty one is nil.
func (d *Decoder) Floats() []float64 {
	n := d.Count(8)
	if n == 0 {
		return nil
	}
	out := make([]float64, n)
	for i := range out {
		out[i] = d.Float()
	}
	return out
}

// Ints reads a list of integers; an empty one is nil.
func (d *Decoder) Ints() []int {
	n := d.Count(4)
	if n == 0 {
		return nil
	}
	out := make([]int, n)
	for i := range out {
		out[i] = d.Int()
	}
	return out
}

// Texts reads a list of strings; an empty one is nil.
func (d *Decoder) Texts() []string {
	var out []string
	for n := d.Count(4); n > 0 && d.err == nil; n-- {
		out = append(out, d.Text())
	}
	return out
}
