package infer

import (
	"bytes"
	"encoding/binary"
	"math"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

func sampleDraws() *Draws {
	return &Draws{
		N: 2, Radii: []float64{1, 10}, LnMass: []float64{20, 25, 21, 26},
		Parameters: []Parameter{{Name: "mass_200c", Unit: "solMass", Values: []float64{1e14, 2e14}}},
		Nuisances:  []Parameter{{Name: "shear_bias", Values: []float64{-0.5, 0.25}}},
		Covers:     [2]float64{200, 3000},
		Assumes:    []string{"mass_200c ~ loguniform(1e+12, 1e+16)"},
		Quality:    Quality{Converged: true, Sampler: "importance", EffectiveDraws: 1.9, TailShape: -0.1, Evaluations: 9, Modes: 1, LogEvidence: -7, EvidenceError: 0.01, HasEvidence: true, Chi2: 8, Dof: 8, PValue: 0.43},
		Checks:     []Check{{Name: "cross shear", Statistic: 9.3, PValue: -1, Passed: true, Note: "nothing seen"}},
		Warnings:   []string{"few draws"},
	}
}

func TestEncodeDecode(t *testing.T) {
	want := sampleDraws()
	data, err := want.MarshalBinary()
	if err != nil {
		t.Fatal(err)
	}
	var got Draws
	if err := got.UnmarshalBinary(data); err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(want, &got); diff != "" {
		t.Errorf("decoding changed the draws:\n%s", diff)
	}
}

func TestEncodingIsCanonical(t *testing.T) {
	a, b := sampleDraws(), sampleDraws()
	a.Warnings, b.Warnings = nil, []string{}
	a.Parameters[0].Values[0], b.Parameters[0].Values[0] = 0, math.Copysign(0, -1)
	x, err := a.MarshalBinary()
	if err != nil {
		t.Fatal(err)
	}
	y, err := b.MarshalBinary()
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(x, y) {
		t.Error("equal draws have different encodings")
	}
}

// Every field enters the encoding: changing any one changes the bytes.
func TestEncodingSeesEveryField(t *testing.T) {
	plain, _ := sampleDraws().MarshalBinary()
	for name, change := range map[string]func(d *Draws){
		"radius":      func(d *Draws) { d.Radii[1] = 11 },
		"ln mass":     func(d *Draws) { d.LnMass[3] += 1e-13 },
		"name":        func(d *Draws) { d.Parameters[0].Name = "mass_500c" },
		"unit":        func(d *Draws) { d.Parameters[0].Unit = "" },
		"value":       func(d *Draws) { d.Nuisances[0].Values[1] = 0.3 },
		"covers":      func(d *Draws) { d.Covers[1]++ },
		"assumes":     func(d *Draws) { d.Assumes = append(d.Assumes, "") },
		"converged":   func(d *Draws) { d.Quality.Converged = false },
		"sampler":     func(d *Draws) { d.Quality.Sampler = "direct" },
		"effective":   func(d *Draws) { d.Quality.EffectiveDraws = 1 },
		"tail":        func(d *Draws) { d.Quality.TailShape = 0 },
		"evaluations": func(d *Draws) { d.Quality.Evaluations++ },
		"modes":       func(d *Draws) { d.Quality.Modes++ },
		"evidence":    func(d *Draws) { d.Quality.LogEvidence = 0 },
		"ev. error":   func(d *Draws) { d.Quality.EvidenceError = 0 },
		"has":         func(d *Draws) { d.Quality.HasEvidence = false },
		"r hat":       func(d *Draws) { d.Quality.RHat = 1 },
		"chi2":        func(d *Draws) { d.Quality.Chi2 = 0 },
		"dof":         func(d *Draws) { d.Quality.Dof = 0 },
		"p":           func(d *Draws) { d.Quality.PValue = 0 },
		"check":       func(d *Draws) { d.Checks[0].Name = "" },
		"statistic":   func(d *Draws) { d.Checks[0].Statistic = 0 },
		"check p":     func(d *Draws) { d.Checks[0].PValue = 0 },
		"passed":      func(d *Draws) { d.Checks[0].Passed = false },
		"note":        func(d *Draws) { d.Checks[0].Note = "" },
		"warnings":    func(d *Draws) { d.Warnings = nil },
	} {
		d := sampleDraws()
		change(d)
		data, err := d.MarshalBinary()
		if err != nil {
			t.Errorf("%s: %v", name, err)
		}
		if bytes.Equal(data, plain) {
			t.Errorf("%s does not enter the encoding", name)
		}
	}
}

func TestEncodeRefuses(t *testing.T) {
	for _, c := range []struct {
		says   string
		change func(d *Draws)
	}{
		{"0 draws", func(d *Draws) { d.N = 0 }},
		{"ln M of draw 2 at 10 kpc is NaN", func(d *Draws) { d.LnMass[3] = math.NaN() }},
		{"ln M of draw 1 at 1 kpc is -Inf", func(d *Draws) { d.LnMass[0] = math.Inf(-1) }},
		{"radii must be positive and rise", func(d *Draws) { d.Radii[1] = 1 }},
		{"3 masses for 2 draws", func(d *Draws) { d.LnMass = d.LnMass[:3] }},
		{"mass_200c of draw 2 is +Inf", func(d *Draws) { d.Parameters[0].Values[1] = math.Inf(1) }},
		{"1 values of shear_bias", func(d *Draws) { d.Nuisances[0].Values = d.Nuisances[0].Values[:1] }},
		{"two columns of draws are called mass_200c", func(d *Draws) { d.Parameters = append(d.Parameters, d.Parameters[0]) }},
		{"has no name", func(d *Draws) { d.Parameters[0].Name = "" }},
		{"cannot cover", func(d *Draws) { d.Covers = [2]float64{2, 1} }},
		{"p-value is NaN", func(d *Draws) { d.Quality.PValue = math.NaN() }},
		{"a count of the quality", func(d *Draws) { d.Quality.Dof = -1 }},
		{`check "cross shear"`, func(d *Draws) { d.Checks[0].PValue = math.NaN() }},
	} {
		d := sampleDraws()
		c.change(d)
		if _, err := d.MarshalBinary(); err == nil || !strings.Contains(err.Error(), c.says) {
			t.Errorf("want an error saying %q, got %v", c.says, err)
		}
	}
}

// Every proper prefix and every extension is refused, and the receiver is left
// as it was.
func TestDecodeRefuses(t *testing.T) {
	data, _ := sampleDraws().MarshalBinary()
	got := Draws{N: 77}
	for n := range data {
		if err := got.UnmarshalBinary(data[:n]); err == nil {
			t.Fatalf("accepted the first %d of %d bytes", n, len(data))
		}
	}
	if err := got.UnmarshalBinary(append(bytes.Clone(data), 0)); err == nil {
		t.Error("accepted a byte too many")
	}
	huge := bytes.Clone(data)
	binary.LittleEndian.PutUint32(huge[len(format)+4:], math.MaxInt32)
	if err := got.UnmarshalBinary(huge); err == nil {
		t.Error("accepted a count beyond the data")
	}
	other := bytes.Replace(data, []byte("draws 1"), []byte("draws 2"), 1)
	if err := got.UnmarshalBinary(other); err == nil || !strings.Contains(err.Error(), "version") {
		t.Errorf("another version: %v", err)
	}
	if got.N != 77 || got.Radii != nil {
		t.Error("a refused decoding changed the receiver")
	}
}

func FuzzDecode(f *testing.F) {
	data, _ := sampleDraws().MarshalBinary()
	f.Add(data)
	f.Add([]byte(format))
	small := &Draws{N: 1}
	data, _ = small.MarshalBinary()
	f.Add(data)
	f.Fuzz(func(t *testing.T, data []byte) {
		var d Draws
		if d.UnmarshalBinary(data) != nil {
			return
		}
		again, err := d.MarshalBinary()
		if err != nil {
			t.Fatalf("decoded what cannot be encoded: %v", err)
		}
		if !bytes.Equal(again, data) {
			t.Fatal("two encodings of the same draws")
		}
	})
}
