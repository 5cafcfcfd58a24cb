package lensing

import (
	"bytes"
	"math"
	"math/rand/v2"
	"testing"

	"github.com/google/go-cmp/cmp"
)

func TestProfileBytes(t *testing.T) {
	few := deep
	few.Galaxies = 500
	catalogued := reduced(t, shapeTask(t, curlew, curlew.Shapes(few, rand.New(rand.NewPCG(1, 1)))))
	catalogued.Warnings = []string{"one", "", "drei — ü"}
	published := reduced(t, profileTask(t, column("error", "", 1, 1, 1, 1, 1)))
	published.Covariance = make([]float64, 25)
	published.Covariance[3] = math.Copysign(0, -1)
	for _, p := range []*Profile{catalogued, published} {
		data, err := p.MarshalBinary()
		if err != nil {
			t.Fatal(err)
		}
		back := new(Profile)
		if err := back.UnmarshalBinary(data); err != nil {
			t.Fatal(err)
		}
		if d := cmp.Diff(p, back); d != "" {
			t.Error(d)
		}
		again, err := back.MarshalBinary()
		if err != nil || !bytes.Equal(data, again) {
			t.Errorf("other bytes the second time, %v", err)
		}
		for n := range data {
			if back.UnmarshalBinary(data[:n]) == nil {
				t.Fatalf("accepted %d bytes of %d", n, len(data))
			}
		}
		if back.UnmarshalBinary(append(data, 0)) == nil {
			t.Error("accepted a byte too many")
		}
	}
}

// FuzzProfile decodes anything: an error, or a profile that encodes to the
// same bytes; never a panic, never memory out of proportion.
func FuzzProfile(f *testing.F) {
	p := reduced(f, profileTask(f, column("error", "", 1, 1, 1, 1, 1)))
	p.Warnings = []string{"w"}
	data, err := p.MarshalBinary()
	if err != nil {
		f.Fatal(err)
	}
	f.Add(data)
	f.Add([]byte(profileFormat))
	f.Fuzz(func(t *testing.T, data []byte) {
		p := new(Profile)
		if p.UnmarshalBinary(data) != nil {
			return
		}
		again, err := p.MarshalBinary()
		if err != nil {
			t.Fatal(err)
		}
		if len(again) != len(data) {
			t.Errorf("%d bytes became %d", len(data), len(again))
		}
	})
}
