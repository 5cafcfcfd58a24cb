package wire

import (
	"bytes"
	"math"
	"testing"

	"github.com/google/go-cmp/cmp"
)

func sample() *Encoder {
	e := NewEncoder("sample 1", 0)
	e.Int(7)
	e.Float(math.Copysign(0, -1))
	e.Flag(true)
	e.Text("é")
	e.Floats([]float64{1.5, -2})
	e.Ints([]int{3, 0})
	e.Texts([]string{"", "x"})
	return e
}

func TestRoundTrip(t *testing.T) {
	d := NewDecoder("sample 1", *sample())
	got := []any{d.Int(), d.Float(), d.Flag(), d.Text(), d.Floats(), d.Ints(), d.Texts()}
	want := []any{7, 0.0, true, "é", []float64{1.5, -2}, []int{3, 0}, []string{"", "x"}}
	if diff := cmp.Diff(want, got); diff != "" {
		t.Error(diff)
	}
	if err := d.Close(); err != nil {
		t.Error(err)
	}
}

// Every shorter or longer string of bytes, and another name, must be refused.
func TestRefusesAnythingElse(t *testing.T) {
	whole := []byte(*sample())
	read := func(format string, data []byte) error {
		d := NewDecoder(format, data)
		d.Int()
		d.Float()
		d.Flag()
		d.Text()
		d.Floats()
		d.Ints()
		d.Texts()
		return d.Close()
	}
	for n := range whole {
		if read("sample 1", whole[:n]) == nil {
			t.Errorf("%d of %d bytes were accepted", n, len(whole))
		}
	}
	if read("sample 1", append(bytes.Clone(whole), 0)) == nil {
		t.Error("a byte too many was accepted")
	}
	if read("sample 2", whole) == nil {
		t.Error("another version was accepted")
	}
}

// A count in damaged bytes must not make the reader allocate for it.
func TestCountIsBounded(t *testing.T) {
	e := NewEncoder("sample 1", 0)
	e.Int(math.MaxInt32)
	if allocs := testing.AllocsPerRun(10, func() { NewDecoder("sample 1", *e).Floats() }); allocs > 8 {
		t.Errorf("%.0f allocations", allocs)
	}
}
