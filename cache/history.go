package cache

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"time"

	bolt "go.etcd.io/bbolt"
)

// Weighing is an entry of the history: what one run of a recipe found.
type Weighing struct {
	Recipe   string
	Number   uint64 // 1, 2, 3, … for each recipe
	Finished time.Time
	Program  string
	Body     Digest // of what was remembered; Output reads it
	Size     int64
}

// Remember adds an entry to the history of w.Recipe and gives its number. Bodies
// that are equal are kept once. An error means that it was not stored.
func (s *Store) Remember(w Weighing, body []byte) (number uint64, err error) {
	if err := s.unwritable(); err != nil {
		return 0, fmt.Errorf("the weighing is not recorded: %w", err)
	}
	w.Body, w.Size = DigestOf(body), int64(len(body))
	err = s.store(w.Body, body, func(tx *bolt.Tx) error {
		if err := s.putOutput(tx, w.Body, body); err != nil {
			return err
		}
		number = 1
		if key := lastOf(tx.Bucket(historyBucket), putString(nil, w.Recipe)); key != nil {
			number += binary.BigEndian.Uint64(key[len(key)-8:])
		}
		key := binary.BigEndian.AppendUint64(putString(nil, w.Recipe), number)
		return put(tx, historyBucket, key, w.encode())
	})
	if err != nil {
		return 0, fmt.Errorf("the weighing is not recorded: %w", s.failed(err))
	}
	return number, nil
}

// lastOf finds the last history key of a recipe.
func lastOf(b *bolt.Bucket, prefix []byte) (last []byte) {
	c := b.Cursor()
	// The largest number is all ones, which no recipe reaches.
	key, _ := c.Seek(append(bytes.Clone(prefix), bytes.Repeat([]byte{0xff}, 8)...))
	if key == nil {
		key, _ = c.Last()
	} else {
		key, _ = c.Prev()
	}
	if bytes.HasPrefix(key, prefix) && len(key) == len(prefix)+8 {
		return key
	}
	return nil
}

// History lists the weighings of a recipe in the order they were made, or of
// all recipes when recipe is "". Damaged entries are left out with a warning.
func (s *Store) History(recipe string) ([]Weighing, error) {
	var list []Weighing
	err := s.tolerate(s.scan(historyBucket, func(key, value []byte, damage error) error {
		if damage != nil {
			s.warn("an entry in the history of weighings is damaged and left out")
			return nil
		}
		w, err := decodeWeighing(key, value)
		if err != nil {
			s.warn("an entry in the history of weighings cannot be read (%v) and is left out", err)
		} else if recipe == "" || w.Recipe == recipe {
			list = append(list, w)
		}
		return nil
	}))
	return list, err
}

// historyFormat is the first byte of an encoded weighing.
const historyFormat = 1

func (w *Weighing) encode() []byte {
	b := putTime([]byte{historyFormat}, w.Finished)
	b = putString(b, w.Program)
	b = append(b, w.Body[:]...)
	return putInt(b, w.Size)
}

func decodeWeighing(key, value []byte) (w Weighing, err error) {
	k := decoder{rest: key}
	w.Recipe, w.Number = k.string(), uint64(k.int())
	if err := k.end(); err != nil {
		return w, err
	}
	d := decoder{rest: value}
	if format := d.bytes(1); d.err == nil && format[0] != historyFormat {
		return w, fmt.Errorf("format %d, expected %d", format[0], historyFormat)
	}
	w.Finished, w.Program = d.time(), d.string()
	w.Body, w.Size = d.digest(), d.int()
	return w, d.end()
}
