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
		err := s.store(r, output)
		for try := 0; try < 3 && errors.Is(err, errGone); try++ {
			err = s.store(r, output)
		}
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

func (s *Store) store(r *Record, output []byte) error {
	large := len(output) > largeOutput
	if large {
		if err := s.writeOutput(r.Output, output); err != nil {
			return err
		}
	}
	key, now := r.Key(), s.o.Now()
	return s.commit(func(tx *bolt.Tx) error {
		if large {
			if s.outputSize(r.Output) != r.Size {
				return errGone
			}
		} else if err := put(tx, outputBucket, r.Output[:], output); err != nil {
			return err
		}
		if err := put(tx, recordBucket, key[:], r.Encode()); err != nil {
			return err
		}
		seconds := binary.BigEndian.AppendUint64(nil, math.Float64bits(r.Seconds))
		if err := put(tx, kindBucket, kindKey(r.Kind), seconds); err != nil {
			return err
		}
		return use(tx, Use{r.Name, key}, now)
	})
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
	if err := put(tx, usedBucket, u.Key[:], binary.BigEndian.AppendUint64(nil, uint64(now.Unix()))); err != nil {
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
