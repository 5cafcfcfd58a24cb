package cache

import (
	"crypto/sha256"
	"encoding/hex"
	"time"
)

// Digest is the SHA-256 of some bytes: a node's output or the content of a file.
type Digest [sha256.Size]byte

// String is the digest in hexadecimal.
func (d Digest) String() string { return hex.EncodeToString(d[:]) }

// Short is the first twelve characters of the digest, for people.
func (d Digest) Short() string { return hex.EncodeToString(d[:6]) }

// DigestOf is the digest of b.
func DigestOf(b []byte) Digest { return sha256.Sum256(b) }

// Key names what a node computes: the SHA-256 of its key transcript.
type Key [sha256.Size]byte

// String is the key in hexadecimal.
func (k Key) String() string { return hex.EncodeToString(k[:]) }

// Short is the first twelve characters of the key, for people.
func (k Key) Short() string { return hex.EncodeToString(k[:6]) }

// KeyOf is the key of a transcript.
func KeyOf(transcript string) Key { return sha256.Sum256([]byte(transcript)) }

// Name says which node of which recipe asked for a record. The same record may
// bear many names.
type Name struct {
	Recipe string
	Node   string
}

// Input is an output that a node read.
type Input struct {
	Node   string
	Digest Digest
}

// File is a file that a node read.
type File struct {
	Path   string
	Digest Digest
}

// Record says how an output came about. It is found by KeyOf(Transcript).
type Record struct {
	Name        Name // who had it computed
	Kind        string
	Version     int    // of the kind
	Transcript  string // everything the output depends on, one fact a line
	Inputs      []Input
	Files       []File
	Output      Digest
	Size        int64  // of the output, bytes
	Program     string // version of the program that computed it
	Seconds     float64
	Diagnostics []string
	Finished    time.Time // UTC, from the clock the caller gave
}

// Key is the key under which the record is stored.
func (r *Record) Key() Key { return KeyOf(r.Transcript) }
