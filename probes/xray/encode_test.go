package xray

import (
	"bytes"
	"testing"

	"github.com/google/go-cmp/cmp"
)

func TestEncoding(t *testing.T) {
	gas := gasOf(coolCore)
	gas.Moves = [][]float64{{1, 2, 3, 4, 5, 6, 7, 8, 9, 10}}
	gas.Inner, gas.Outer, gas.Words, gas.Fitted, gas.Chi2, gas.Dof, gas.Notes = 1, 2000, "a form", true, 44.5, 44, []string{"one", "two"}
	b, err := gas.MarshalBinary()
	if err != nil {
		t.Fatal(err)
	}
	var back Gas
	if err := back.UnmarshalBinary(b); err != nil {
		t.Fatal(err)
	}
	if d := cmp.Diff(gas, &back); d != "" {
		t.Error(d)
	}
	again, _ := back.MarshalBinary()
	if !bytes.Equal(b, again) {
		t.Error("decoding and encoding changes the bytes")
	}
	// Bytes that were cut short, lengthened, of another kind, or that announce
	// more than they hold are refused.
	s := annuli(0, 1, 2)
	other, _ := s.MarshalBinary()
	huge := append([]byte(nil), b...)
	copy(huge[8+len(gasFormat):], []byte{255, 255, 255, 255, 255, 255, 255, 127})
	for name, bad := range map[string][]byte{"cut": b[:len(b)-3], "longer": append(append([]byte(nil), b...), 0), "other": other, "huge": huge, "empty": nil} {
		if err := new(Gas).UnmarshalBinary(bad); err == nil {
			t.Errorf("%s: accepted", name)
		}
	}
	var spectra Spectra
	if err := spectra.UnmarshalBinary(other); err != nil {
		t.Fatal(err)
	}
	if d := cmp.Diff(s, &spectra); d != "" {
		t.Error(d)
	}
	if err := spectra.UnmarshalBinary(b); err == nil {
		t.Error("a density taken for temperatures")
	}
}

func FuzzDecode(f *testing.F) {
	b, _ := gasOf(coolCore).MarshalBinary()
	f.Add(b)
	s, _ := annuli(0, 1, 2).MarshalBinary()
	f.Add(s)
	f.Fuzz(func(t *testing.T, b []byte) {
		var g Gas
		if g.UnmarshalBinary(b) == nil {
			if again, _ := g.MarshalBinary(); !bytes.Equal(b, again) {
				t.Error("what was decoded encodes to other bytes")
			}
		}
	})
}
