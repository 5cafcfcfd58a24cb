package cache

import (
	"bytes"
	"errors"

	bolt "go.etcd.io/bbolt"
)

// put stores a value under its seal.
func put(tx *bolt.Tx, bucket, key, value []byte) error {
	return tx.Bucket(bucket).Put(key, seal(bucket, key, value))
}

// value checks an entry and gives a copy of its value. It must run under guard.
func value(bucket, key, sealed []byte) ([]byte, error) {
	v, err := unseal(bucket, key, sealed)
	if err != nil {
		return nil, &damageError{err.Error()}
	}
	return v, nil
}

// get reads a value, nil when there is none. The error is always a damageError.
func get(tx *bolt.Tx, bucket, key []byte) (v []byte, err error) {
	err = guard(func() (err error) {
		b := tx.Bucket(bucket)
		if b == nil {
			return nil
		}
		if sealed := b.Get(key); sealed != nil {
			v, err = value(bucket, key, sealed)
		}
		return err
	})
	return v, err
}

// scan calls each with every entry of a bucket, in the order of keys, reading
// them in transactions short enough not to keep other processes waiting. An
// entry that does not verify comes with a damageError; when pages cannot be read
// the scan ends with one.
func (s *Store) scan(bucket []byte, each func(key, value []byte, damage error) error) error {
	type entry struct {
		key, value []byte
		damage     error
	}
	var next []byte
	for {
		var chunk []entry
		err := s.view(func(tx *bolt.Tx) error {
			b := tx.Bucket(bucket)
			if b == nil {
				return nil
			}
			size := 0
			c := b.Cursor()
			for key, sealed := c.Seek(next); key != nil && len(chunk) < 1000 && size < 4<<20; key, sealed = c.Next() {
				v, err := value(bucket, key, sealed)
				chunk = append(chunk, entry{bytes.Clone(key), v, err})
				size += len(v)
			}
			return nil
		})
		for _, e := range chunk {
			if e.damage != nil {
				s.damaged.Store(true)
			}
			if err := each(e.key, e.value, e.damage); err != nil {
				return err
			}
		}
		switch {
		case errors.Is(err, errAbsent):
			return nil
		case isDamage(err):
			s.damaged.Store(true)
			return err
		case err != nil:
			return err
		case len(chunk) == 0:
			return nil
		}
		next = append(chunk[len(chunk)-1].key, 0)
	}
}

// tolerate makes a warning of damage that ended a scan.
func (s *Store) tolerate(err error) error {
	if isDamage(err) {
		s.warn("part of the store in %s cannot be read: %v", s.dir, err)
		return nil
	}
	return err
}
