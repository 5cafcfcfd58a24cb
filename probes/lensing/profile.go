package lensing

import (
	"encoding/binary"
	"fmt"
	"math"
)

// Profile is the shear about a centre in radial bins: what a likelihood needs,
// whether it came from a shape catalogue or from a published table.
type Profile struct {
	Bins []Bin // of rising radius
	// Covariance of the tangential shears, len(Bins)² numbers, row by row; nil
	// when the bins are independent.
	Covariance []float64
	HasCross   bool
	// Counted says that the bins were filled here from a catalogue, so that
	// their Sources, Flipped and Turned hold.
	Counted  bool
	Warnings []string
}

// Bin is one annulus. Radii in kpc.
type Bin struct {
	Inner, Outer float64
	Mean         float64 // weighted mean radius
	Shear        float64 // tangential reduced shear
	Minus, Plus  float64 // sizes of its errors below and above
	Cross        float64
	Flipped      float64 // Shear with the sign of e2 reversed
	Turned       float64 // scatter of Shear were every shape turned at random
	Beta, Beta2  float64 // ⟨β⟩ and ⟨β²⟩ of the sources, relative to a source at infinity
	Sources      int
	Weight       float64
	Nodes        []Node // where a model is evaluated to average it over the bin
}

// Node is one radius in kpc at which the model is evaluated, with its share of
// the bin. The shares of a bin add up to one.
type Node struct{ Radius, Share float64 }

// Error is the mean of the two errors.
func (b Bin) Error() float64 { return (b.Minus + b.Plus) / 2 }

// meanBeta is ⟨β⟩ over the bins, weighted by their errors.
func meanBeta(bins []Bin) float64 {
	beta, weight := 0.0, 0.0
	for _, b := range bins {
		w := 1 / (b.Error() * b.Error())
		beta, weight = beta+w*b.Beta, weight+w
	}
	return beta / weight
}

const profileFormat = "steelyard/lensing/profile/2\n"

// MarshalBinary encodes the profile: equal profiles give equal bytes.
func (p *Profile) MarshalBinary() ([]byte, error) {
	out := []byte(profileFormat)
	count := func(n int) { out = binary.LittleEndian.AppendUint64(out, uint64(n)) }
	number := func(xs ...float64) {
		for _, x := range xs {
			if x == 0 {
				x = 0 // negative zero
			}
			out = binary.LittleEndian.AppendUint64(out, math.Float64bits(x))
		}
	}
	flag := func(b bool) {
		if b {
			count(1)
		} else {
			count(0)
		}
	}
	flag(p.HasCross)
	flag(p.Counted)
	count(len(p.Bins))
	for _, b := range p.Bins {
		number(b.Inner, b.Outer, b.Mean, b.Shear, b.Minus, b.Plus, b.Cross, b.Flipped, b.Turned, b.Beta, b.Beta2, b.Weight)
		count(b.Sources)
		count(len(b.Nodes))
		for _, n := range b.Nodes {
			number(n.Radius, n.Share)
		}
	}
	count(len(p.Covariance))
	number(p.Covariance...)
	count(len(p.Warnings))
	for _, w := range p.Warnings {
		count(len(w))
		out = append(out, w...)
	}
	return out, nil
}

// UnmarshalBinary decodes what MarshalBinary wrote, and nothing else.
func (p *Profile) UnmarshalBinary(data []byte) error {
	if len(data) < len(profileFormat) || string(data[:len(profileFormat)]) != profileFormat {
		return fmt.Errorf("lensing: not a shear profile of this version")
	}
	r := reader{data: data[len(profileFormat):]}
	*p = Profile{HasCross: r.count() == 1, Counted: r.count() == 1}
	p.Bins = make([]Bin, r.length(8))
	for i := range p.Bins {
		b := &p.Bins[i]
		for _, x := range []*float64{&b.Inner, &b.Outer, &b.Mean, &b.Shear, &b.Minus, &b.Plus, &b.Cross, &b.Flipped, &b.Turned, &b.Beta, &b.Beta2, &b.Weight} {
			*x = r.number()
		}
		b.Sources = int(r.count())
		b.Nodes = make([]Node, r.length(16))
		for j := range b.Nodes {
			b.Nodes[j] = Node{r.number(), r.number()}
		}
	}
	if n := r.length(8); n > 0 {
		p.Covariance = make([]float64, n)
	}
	for i := range p.Covariance {
		p.Covariance[i] = r.number()
	}
	if n := r.length(8); n > 0 {
		p.Warnings = make([]string, n)
	}
	for i := range p.Warnings {
		p.Warnings[i] = string(r.take(r.length(1)))
	}
	if r.short || len(r.data) > 0 {
		return fmt.Errorf("lensing: a damaged shear profile")
	}
	if n := len(p.Covariance); n != 0 && n != len(p.Bins)*len(p.Bins) {
		return fmt.Errorf("lensing: a shear profile of %d bins with a covariance of %d numbers", len(p.Bins), n)
	}
	return nil
}

// reader takes numbers off the front of data; short is set, and zeros are
// yielded, when there are too few.
type reader struct {
	data  []byte
	short bool
}

func (r *reader) take(n int) []byte {
	if n > len(r.data) {
		r.short = true
		n = 0
	}
	head := r.data[:n]
	r.data = r.data[n:]
	return head
}

func (r *reader) count() uint64 {
	if b := r.take(8); len(b) == 8 {
		return binary.LittleEndian.Uint64(b)
	}
	return 0
}

func (r *reader) number() float64 { return math.Float64frombits(r.count()) }

// length reads the length of a list whose items take at least size bytes each,
// so that damaged bytes cannot ask for more memory than they are long.
func (r *reader) length(size int) int {
	n := r.count()
	if n > uint64(len(r.data)/size) {
		r.short = true
		return 0
	}
	return int(n)
}
