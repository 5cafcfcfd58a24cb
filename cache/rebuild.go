package cache

import (
	"bytes"
	"errors"
	"io/fs"
	"os"
	"time"

	bolt "go.etcd.io/bbolt"
)

// rebuild replaces a damaged database by a new one with every value that still
// verifies. The damaged file is kept beside it until the store is trimmed. The
// caller holds the gate.
func (s *Store) rebuild() error {
	path, fresh, aside := s.database(), s.database()+".new", s.database()+".damaged"
	if err := os.Remove(fresh); err != nil && !errors.Is(err, fs.ErrNotExist) {
		return err
	}
	next, err := bolt.Open(fresh, 0o666, &bolt.Options{Timeout: s.o.Wait, FreelistType: bolt.FreelistMapType})
	if err != nil {
		return err
	}
	kept := 0
	err = next.Update(func(tx *bolt.Tx) error {
		if err := s.prepare(tx); err != nil {
			return err
		}
		// What cannot be read is lost and will be computed again.
		guard(func() error {
			old, err := s.open(true)
			if err != nil {
				return err
			}
			defer old.Close()
			return old.View(func(from *bolt.Tx) error {
				kept = salvage(tx, from)
				return nil
			})
		})
		return nil
	})
	if closing := next.Close(); err == nil {
		err = closing
	}
	if err != nil {
		os.Remove(fresh)
		return err
	}
	os.Remove(aside)
	if os.Link(path, aside) != nil {
		os.Rename(path, aside) // a file system without links
	}
	if err := os.Rename(fresh, path); err != nil {
		return err
	}
	s.damaged.Store(false)
	s.warn("the store in %s was damaged: %d of its entries could be read and were kept, the rest is computed again; the damaged file is kept as %s",
		s.dir, kept, aside)
	return syncDir(s.dir)
}

// salvage copies the values of from that verify into the prepared database of
// to and counts them. It reads each bucket from both ends, so that one
// unreadable page costs only what is on it.
func salvage(to, from *bolt.Tx) (kept int) {
	for _, name := range buckets[1:] {
		keep := func(key, sealed []byte) {
			if _, err := unseal(name, key, sealed); err != nil {
				return
			}
			if to.Bucket(name).Get(key) == nil && to.Bucket(name).Put(bytes.Clone(key), bytes.Clone(sealed)) == nil {
				kept++
			}
		}
		for _, forward := range []bool{true, false} {
			guard(func() error {
				b := from.Bucket(name)
				if b == nil {
					return nil
				}
				c := b.Cursor()
				first, next := c.First, c.Next
				if !forward {
					first, next = c.Last, c.Prev
				}
				left := from.Size() / sealSize // damaged pages may lead in a circle
				for key, value := first(); key != nil && left > 0; key, value = next() {
					keep(key, value)
					left--
				}
				return nil
			})
		}
	}
	return kept
}

// syncDir makes renames in a folder last.
func syncDir(dir string) error {
	d, err := os.Open(dir)
	if err != nil {
		return err
	}
	defer d.Close()
	return d.Sync()
}

// stale is how old an unfinished file must be before it counts as abandoned.
const stale = time.Hour
