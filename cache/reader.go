package cache

import (
	"encoding/binary"
	"errors"
	"fmt"
	"math"
	"runtime/debug"
	"time"

	bolt "go.etcd.io/bbolt"
)

// Reader looks things up in one transaction. It must not be used after the
// function it was given to has returned, nor the store from inside it.
type Reader struct {
	s  *Store
	tx *bolt.Tx // nil when nothing can be read
}

// View runs look with a reader. A store that is absent, locked for too long or
// unreadable looks empty and, unless absent, leaves a warning; the only errors
// are look's own and a store written by a newer program.
func (s *Store) View(look func(*Reader) error) error {
	var own error
	var bug any // a panic of look itself must not pass for damage
	ran := false
	err := s.view(func(tx *bolt.Tx) error {
		defer func() {
			if bug = recover(); bug != nil {
				bug = fmt.Sprintf("%v\n%s", bug, debug.Stack())
			}
		}()
		ran = true
		own = look(&Reader{s, tx})
		return nil
	})
	if bug != nil {
		panic(bug)
	}
	var newer *newerError
	switch {
	case err == nil:
		return own
	case errors.As(err, &newer):
		return err
	case isDamage(err):
		s.damaged.Store(true)
		s.warn("the store in %s is damaged (%v): what cannot be read is computed again", s.dir, err)
	case !errors.Is(err, errAbsent):
		s.warn("the store in %s cannot be read: %v", s.dir, err)
	}
	if ran {
		return own
	}
	return look(&Reader{s: s})
}

// get reads a value; a damaged one is nil and the reason.
func (r *Reader) get(bucket, key []byte) ([]byte, error) {
	if r.tx == nil {
		return nil, nil
	}
	value, err := get(r.tx, bucket, key)
	if err != nil {
		r.s.damaged.Store(true)
	}
	return value, err
}

// Record looks up a record whose output is there too. Without one it gives nil
// and a reason when something is damaged or missing, nil and "" when the key is
// merely unknown.
func (r *Reader) Record(k Key) (record *Record, reason string) {
	r.s.mu.Lock()
	record = r.s.records[k]
	r.s.mu.Unlock()
	if record != nil {
		return record, ""
	}
	value, err := r.get(recordBucket, k[:])
	if err != nil {
		return nil, fmt.Sprintf("its record in the store is damaged: %v", err)
	}
	if value == nil {
		return nil, ""
	}
	record, err = DecodeRecord(value)
	if err != nil {
		return nil, fmt.Sprintf("its record in the store cannot be read: %v", err)
	}
	if !r.holds(record) {
		return nil, "its output is missing from the store"
	}
	return record, ""
}

// holds says whether a record's output is there, without reading it.
func (r *Reader) holds(record *Record) bool {
	if record.Size > largeOutput {
		return r.s.outputSize(record.Output) == record.Size
	}
	found := false
	guard(func() error {
		found = r.tx.Bucket(outputBucket).Get(record.Output[:]) != nil
		return nil
	})
	return found
}

// Past looks up the last record that a node of a recipe used and the one before
// it; nil where there was none or it is no longer in the store. Their outputs
// may be gone.
func (r *Reader) Past(n Name) (last, before *Record) {
	if r.tx == nil {
		return nil, nil
	}
	lastKey, beforeKey := lastKeys(r.tx, n)
	return r.bare(lastKey), r.bare(beforeKey)
}

// bare looks up a record whether or not its output is there.
func (r *Reader) bare(k Key) *Record {
	if k == (Key{}) {
		return nil
	}
	value, err := r.get(recordBucket, k[:])
	if err != nil || value == nil {
		return nil
	}
	record, err := DecodeRecord(value)
	if err != nil {
		return nil
	}
	return record
}

// Seconds is how long a kind of node took when it was last computed, 0 when it
// never was.
func (r *Reader) Seconds(kind string) float64 {
	value, err := r.get(kindBucket, kindKey(kind))
	if err != nil || len(value) != 8 {
		return 0
	}
	return math.Float64frombits(binary.BigEndian.Uint64(value))
}

// usedAgain is how long a use stands before it is noted again: an unchanged
// rerun should not have to write.
const usedAgain = 24 * time.Hour

// Noted says whether a use is on record, so that Touch has nothing to add.
func (r *Reader) Noted(u Use) bool {
	if r.tx == nil {
		return false
	}
	last, _ := lastKeys(r.tx, u.Name)
	if last != u.Key {
		return false
	}
	value, err := r.get(usedBucket, u.Key[:])
	if err != nil || len(value) != 8 {
		return false
	}
	used := time.Unix(int64(binary.BigEndian.Uint64(value)), 0)
	return r.s.o.Now().Sub(used) < usedAgain
}
