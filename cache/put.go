package cache

import (
	"bytes"
	"encoding/binary"
	"errors"
	"fmt"
	"math"
	"time"

	bolt "go.etcd.io/bbolt"
)

// errGone says that an output file was trimmed away by another process between
// being written and being recorded.
var errGone = errors.New("the output was removed while it was being stored")

// Put stores an output and the record of how it came about, and returns when
// both are safely on disk. It fills in the record's Output and Size. When they
// cannot be stored they are kept in memory, and Warnings says so.
func (s *Store) Put(r *Record, output []byte) {
	r.Output, r.Size = DigestOf(output), int64(len(output))
	if s.unwritable() == nil {
		now := s.o.Now()
		err := s.store(r.Output, output, func(tx *bolt.Tx) error {
			if err := s.putRecord(tx, r, output); err != nil {
				return err
			}
			return use(tx, Use{r.Name, r.Key()}, now)
		})
		if err == nil {
			return
		}
		s.failed(err)
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	s.records[r.Key()] = r
	s.outputs[r.Output] = bytes.Clone(output)
}

// store makes a large output a file before it commits what refers to it.
func (s *Store) store(d Digest, output []byte, write func(*bolt.Tx) error) error {
	for try := 1; ; try++ {
		if len(output) > largeOutput {
			if err := s.writeOutput(d, output); err != nil {
				return err
			}
		}
		err := s.commit(write)
		if err == nil {
			s.grown.Store(true)
		}
		if !errors.Is(err, errGone) || try == 3 {
			return err
		}
	}
}

// putRecord writes a record and its output; a large output is a file already.
func (s *Store) putRecord(tx *bolt.Tx, r *Record, output []byte) error {
	if err := s.putOutput(tx, r.Output, output); err != nil {
		return err
	}
	key := r.Key()
	if err := put(tx, recordBucket, key[:], r.Encode()); err != nil {
		return err
	}
	seconds := binary.BigEndian.AppendUint64(nil, math.Float64bits(r.Seconds))
	return put(tx, kindBucket, kindKey(r.Kind), seconds)
}

// putOutput writes a small output, and sees that a large one has not been
// trimmed away before anything referred to it.
func (s *Store) putOutput(tx *bolt.Tx, d Digest, output []byte) error {
	if len(output) <= largeOutput {
		return put(tx, outputBucket, d[:], output)
	}
	if s.outputSize(d) != int64(len(output)) {
		return errGone
	}
	return nil
}

// Use says that a node of a recipe uses a record.
type Use struct {
	Name Name
	Key  Key
}

// Touch notes that records were used: by whom, for explaining what changed the
// next time, and when, for trimming the longest unused first.
func (s *Store) Touch(uses []Use) {
	if len(uses) == 0 || s.unwritable() != nil {
		return
	}
	now := s.o.Now()
	err := s.commit(func(tx *bolt.Tx) error {
		for _, u := range uses {
			if err := use(tx, u, now); err != nil {
				return err
			}
		}
		return nil
	})
	if err != nil {
		s.failed(err)
	}
}

func use(tx *bolt.Tx, u Use, now time.Time) error {
	if err := noteUse(tx, u.Key, now); err != nil {
		return err
	}
	last, before := lastKeys(tx, u.Name)
	if last == u.Key {
		return nil
	}
	if last != (Key{}) {
		before = last
	}
	return put(tx, nameBucket, u.Name.bytes(), append(u.Key[:], before[:]...))
}

func noteUse(tx *bolt.Tx, k Key, now time.Time) error {
	return put(tx, usedBucket, k[:], binary.BigEndian.AppendUint64(nil, uint64(now.Unix())))
}

// lastKeys gives the key that a name stood for last and the one before it, zero
// where there was none.
func lastKeys(tx *bolt.Tx, n Name) (last, before Key) {
	value, err := get(tx, nameBucket, n.bytes())
	if err == nil && len(value) == 2*len(last) {
		copy(last[:], value)
		copy(before[:], value[len(last):])
	}
	return last, before
}

// bytes is the name as a database key. Neither part can hold a zero byte that
// would make two names equal: the length of the recipe comes first.
func (n Name) bytes() []byte {
	return append(putString(nil, n.Recipe), n.Node...)
}

func nameOf(key []byte) (Name, error) {
	d := decoder{rest: key}
	n := Name{Recipe: d.string()}
	n.Node = string(d.rest)
	if d.err != nil {
		return Name{}, fmt.Errorf("name: %w", d.err)
	}
	return n, nil
}

// kindKey makes room for a kind without a name: bbolt refuses empty keys.
func kindKey(kind string) []byte { return putString(nil, kind) }
