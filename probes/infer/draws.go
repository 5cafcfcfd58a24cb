package infer

import (
	"crypto/sha256"
	"encoding/binary"
	"fmt"
	"math"
	"math/rand/v2"
)

// Draws is what an estimate yields: equally weighted draws of its parameters,
// of each shared nuisance it names, and of ln M(<r) on the fixed grid of radii.
// Everything printed comes from these draws.
type Draws struct {
	N          int       // number of draws
	Radii      []float64 // kpc, rising: Grid()
	LnMass     []float64 // N × len(Radii), row-major: draw i at radius j is LnMass[i*len(Radii)+j], ln of Msun
	Parameters []Parameter
	// Nuisances are the shared nuisances this estimate names, each draw's value
	// as its prior score Φ⁻¹(F_prior(ν)).
	Nuisances []Parameter
	// Covers is the range of radii in kpc that the data reach; outside it a mass
	// is extrapolated. Both ends may be equal (one mass at one radius).
	Covers [2]float64
	// Assumes says in words, one item a line, what the masses rest on, the prior
	// on the mass first.
	Assumes  []string
	Quality  Quality
	Checks   []Check
	Warnings []string
}

// Parameter is one named column of draws.
type Parameter struct {
	Name   string // the field's name: mass_200c, concentration, dispersion, …
	Unit   string // VOUnits, "" for a pure number
	Values []float64
}

// Quality says how far the draws can be trusted.
type Quality struct {
	Converged      bool
	Sampler        string  // "importance", "ensemble" or "direct" (independent draws of a closed form)
	EffectiveDraws float64 // counts the resampling too
	TailShape      float64 // Pareto k̂ of the importance weights; NaN-free: 0 when not defined
	Evaluations    int     // likelihood evaluations spent
	Modes          int
	LogEvidence    float64
	EvidenceError  float64 // one standard deviation of LogEvidence
	HasEvidence    bool
	RHat           float64 // worst split R̂ of the ensemble; 0 when not used
	Chi2           float64 // of the best fit
	Dof            int     // 0 when the estimate fits nothing
	PValue         float64 // of Chi2 with Dof; 1 when Dof is 0
}

// Check is one test printed with the result.
type Check struct {
	Name      string
	Statistic float64
	PValue    float64 // NaN-free; -1 when the check has no p-value
	Passed    bool
	Note      string // a sentence for the reader, "" when there is nothing to say
}

// Grid returns the radii, in kpc, on which every estimate gives ln M: 73 points
// from 1 kpc to 30 Mpc, evenly spaced in the logarithm.
func Grid() []float64 {
	const n, from, to = 73, 1.0, 30000.0
	r := make([]float64, n)
	for i := range r {
		r[i] = from * math.Exp(math.Log(to/from)*float64(i)/(n-1))
	}
	return r
}

// Stream names a reproducible source of random numbers. It is derived from a
// node's key and the recipe's seed, so the same draws come out for any number
// of workers and any order of work.
type Stream [sha256.Size]byte

// NewStream derives a stream from the facts that identify it.
func NewStream(facts ...string) Stream {
	h := sha256.New()
	for _, f := range facts {
		fmt.Fprintf(h, "%q\n", f)
	}
	return Stream(h.Sum(nil))
}

// Sub derives an independent stream for a named part of the work.
func (s Stream) Sub(name string) Stream { return NewStream(string(s[:]), name) }

// Rand returns generator number i of the stream. Generators are not safe for
// concurrent use; give each chunk of work its own.
func (s Stream) Rand(i int) *rand.Rand {
	h := sha256.New()
	h.Write(s[:])
	_ = binary.Write(h, binary.LittleEndian, int64(i))
	sum := h.Sum(nil)
	return rand.New(rand.NewPCG(binary.LittleEndian.Uint64(sum), binary.LittleEndian.Uint64(sum[8:])))
}

// Options says how many draws to make, from which stream, with how many
// goroutines. The result does not depend on Workers.
type Options struct {
	Draws   int // 0 means 4000
	Stream  Stream
	Workers int // 0 means 1
}
