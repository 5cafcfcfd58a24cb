package engine

import (
	"crypto/sha256"
	"encoding/binary"
	"encoding/hex"
	"math"
	"runtime"
	"sync"
)

// Arithmetic is a fingerprint of how this machine and this build compute: the
// same program gives other last digits on another kind of processor, with other
// compiler settings, or with instructions switched off. It enters every key, so
// that only results that would come out the same to the last bit are reused.
var Arithmetic = sync.OnceValue(func() string {
	h := sha256.New()
	record := func(x float64) {
		var b [8]byte
		binary.LittleEndian.PutUint64(b[:], math.Float64bits(x))
		h.Write(b[:])
	}
	x := 0.0123
	for range 64 {
		// The conversion forbids fusing, so the arguments are the same everywhere.
		x = float64(x*1.09375) + 0.0078125
		record(math.Exp(x))
		record(math.Exp(-x))
		record(math.Expm1(x))
		record(math.Log(x))
		record(math.Log1p(x))
		record(math.Pow(x, 1.37))
		record(math.Sin(x))
		record(math.Tan(x))
		record(math.Atan(x))
		record(math.Sinh(x / 8))
		record(math.Tanh(x / 8))
		record(math.Hypot(x, 1.1))
		record(math.Erf(x / 8))
		record(math.Gamma(1 + x/8))
		record(x*1.1 - 0.3) // fused into one rounding, or not
	}
	return runtime.GOARCH + " " + hex.EncodeToString(h.Sum(nil)[:8])
})
