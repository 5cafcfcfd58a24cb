package cache

import (
	"crypto/sha256"
	"encoding/binary"
	"errors"
	"fmt"
	"math"
	"time"
)

// recordFormat is the first byte of an encoded record. Raise it when the layout
// below changes; records of another format are recomputed, not guessed at.
const recordFormat = 1

// A record is a list of fields without padding: strings and lists carry their
// length in four bytes, numbers take eight, all big-endian. There is one way to
// write a record, so decoding and encoding again gives the same bytes.

// Encode writes a record as bytes.
func (r *Record) Encode() []byte {
	b := append(make([]byte, 0, 512), recordFormat)
	b = putString(b, r.Name.Recipe)
	b = putString(b, r.Name.Node)
	b = putString(b, r.Kind)
	b = putInt(b, int64(r.Version))
	b = putString(b, r.Transcript)
	b = putCount(b, len(r.Inputs))
	for _, in := range r.Inputs {
		b = append(putString(b, in.Node), in.Digest[:]...)
	}
	b = putCount(b, len(r.Files))
	for _, f := range r.Files {
		b = append(putString(b, f.Path), f.Digest[:]...)
	}
	b = append(b, r.Output[:]...)
	b = putInt(b, r.Size)
	b = putString(b, r.Program)
	b = putInt(b, int64(math.Float64bits(r.Seconds)))
	b = putCount(b, len(r.Diagnostics))
	for _, d := range r.Diagnostics {
		b = putString(b, d)
	}
	return putTime(b, r.Finished)
}

// DecodeRecord reads what Encode wrote. Anything else is an error.
func DecodeRecord(b []byte) (*Record, error) {
	d := decoder{rest: b}
	if format := d.bytes(1); d.err == nil && format[0] != recordFormat {
		return nil, fmt.Errorf("record of format %d, expected %d", format[0], recordFormat)
	}
	r := &Record{}
	r.Name.Recipe = d.string()
	r.Name.Node = d.string()
	r.Kind = d.string()
	r.Version = int(d.int())
	r.Transcript = d.string()
	for range d.count(4 + sha256.Size) {
		r.Inputs = append(r.Inputs, Input{d.string(), d.digest()})
	}
	for range d.count(4 + sha256.Size) {
		r.Files = append(r.Files, File{d.string(), d.digest()})
	}
	r.Output = d.digest()
	r.Size = d.int()
	r.Program = d.string()
	r.Seconds = math.Float64frombits(uint64(d.int()))
	for range d.count(4) {
		r.Diagnostics = append(r.Diagnostics, d.string())
	}
	r.Finished = d.time()
	if err := d.end(); err != nil {
		return nil, fmt.Errorf("record: %w", err)
	}
	return r, nil
}

func putCount(b []byte, n int) []byte { return binary.BigEndian.AppendUint32(b, uint32(n)) }

func putString(b []byte, s string) []byte { return append(putCount(b, len(s)), s...) }

func putInt(b []byte, n int64) []byte { return binary.BigEndian.AppendUint64(b, uint64(n)) }

// putTime keeps seconds and nanoseconds apart, so that every time fits.
func putTime(b []byte, t time.Time) []byte {
	return putCount(putInt(b, t.Unix()), t.Nanosecond())
}

// decoder reads fields one by one; after the first error it yields zeros.
type decoder struct {
	rest []byte
	err  error
}

var (
	errShort = errors.New("ends too early")
	errRest  = errors.New("bytes left over at the end")
)

func (d *decoder) bytes(n int) []byte {
	if d.err != nil {
		return nil
	}
	if n < 0 || n > len(d.rest) {
		d.err = errShort
		return nil
	}
	b := d.rest[:n]
	d.rest = d.rest[n:]
	return b
}

func (d *decoder) uint32() int {
	if b := d.bytes(4); b != nil {
		return int(binary.BigEndian.Uint32(b))
	}
	return 0
}

// count reads the length of a list whose elements take at least size bytes
// each, and refuses one that cannot fit in what is left.
func (d *decoder) count(size int) int {
	n := d.uint32()
	if d.err == nil && n > len(d.rest)/size {
		d.err = errShort
	}
	if d.err != nil {
		return 0
	}
	return n
}

func (d *decoder) string() string { return string(d.bytes(d.uint32())) }

func (d *decoder) int() int64 {
	if b := d.bytes(8); b != nil {
		return int64(binary.BigEndian.Uint64(b))
	}
	return 0
}

func (d *decoder) digest() (digest Digest) {
	copy(digest[:], d.bytes(sha256.Size))
	return digest
}

func (d *decoder) time() time.Time {
	seconds, nanos := d.int(), d.uint32()
	if nanos >= 1e9 && d.err == nil {
		d.err = errors.New("time with too many nanoseconds")
	}
	if d.err != nil {
		return time.Time{}
	}
	return time.Unix(seconds, int64(nanos)).UTC()
}

func (d *decoder) end() error {
	if d.err == nil && len(d.rest) > 0 {
		d.err = errRest
	}
	return d.err
}

// Every value in the database is sealed: its last bytes are a checksum over
// the bucket, the key and the value, so that neither a changed byte nor a value
// under the wrong key is ever believed.
const sealSize = 16

func checksum(bucket, key, value []byte) []byte {
	h := sha256.New()
	h.Write(putCount(nil, len(bucket)))
	h.Write(bucket)
	h.Write(putCount(nil, len(key)))
	h.Write(key)
	h.Write(value)
	return h.Sum(nil)[:sealSize]
}

func seal(bucket, key, value []byte) []byte {
	return append(value[:len(value):len(value)], checksum(bucket, key, value)...)
}

// unseal checks a sealed value and returns a copy of what was sealed, for the
// database lends its bytes only while a transaction lasts.
func unseal(bucket, key, sealed []byte) ([]byte, error) {
	n := len(sealed) - sealSize
	if n < 0 {
		return nil, errors.New("too short to carry a checksum")
	}
	if string(checksum(bucket, key, sealed[:n])) != string(sealed[n:]) {
		return nil, errors.New("checksum does not match")
	}
	return append([]byte{}, sealed[:n]...), nil
}
