package cache

import (
	"errors"
	"io/fs"
	"os"
	"time"

	bolt "go.etcd.io/bbolt"
)

// freshSuffix and damagedSuffix name what lies beside the database while it is
// rewritten and after it was found damaged.
const (
	freshSuffix   = ".new"
	damagedSuffix = ".damaged"
)

// stale is how old what nobody refers to must be before it counts as abandoned
// and not as being written by another process.
const stale = time.Hour

// rebuild replaces a damaged database by a new one with every value that still
// verifies. The damaged file is kept beside it until the store is trimmed. The
// caller holds the gate.
func (s *Store) rebuild() error {
	path := s.database()
	kept := 0
	err := s.rewrite(func(fresh *bolt.DB) (err error) {
		// Opened for reading, where it still can be, others cannot write to it.
		if old, _, err := openDatabase(path, true); err == nil {
			defer old.Close()
		}
		if err := fresh.Update(s.prepare); err != nil {
			return err
		}
		if kept, err = salvage(fresh, path); err != nil {
			return err
		}
		os.Remove(path + damagedSuffix)
		if os.Link(path, path+damagedSuffix) != nil {
			os.Rename(path, path+damagedSuffix) // a file system without links
		}
		return nil
	})
	if err != nil {
		return err
	}
	s.damaged.Store(false)
	s.sound.Store(true)
	s.warn("the store in %s was damaged: %d of its entries could be read and were kept, the rest is computed again when needed; the damaged file is kept as %s",
		s.dir, kept, path+damagedSuffix)
	return nil
}

// rewrite puts a new database, filled by fill, in the place of the old one. Other
// processes that wait for the old one's lock notice and open the new one.
func (s *Store) rewrite(fill func(fresh *bolt.DB) error) error {
	path := s.database()
	if err := os.Remove(path + freshSuffix); err != nil && !errors.Is(err, fs.ErrNotExist) {
		return err
	}
	fresh, err := bolt.Open(path+freshSuffix, 0o666, &bolt.Options{Timeout: s.o.Wait, FreelistType: bolt.FreelistMapType})
	if err != nil {
		return err
	}
	err = fill(fresh)
	if closing := fresh.Close(); err == nil {
		err = closing
	}
	if err == nil {
		err = os.Rename(path+freshSuffix, path)
	}
	if err != nil {
		os.Remove(path + freshSuffix)
		return err
	}
	return syncDir(s.dir)
}

// salvage copies the values that verify from a damaged file into a prepared
// database and counts them. The error is one of writing.
func salvage(to *bolt.DB, path string) (kept int, err error) {
	file, err := os.Open(path)
	if err != nil {
		return 0, nil // nothing to be had
	}
	defer file.Close()
	pages, _ := newPageFile(file)
	if pages == nil {
		return 0, nil
	}
	tx, size := (*bolt.Tx)(nil), 0
	defer func() {
		if tx != nil {
			tx.Rollback()
		}
	}()
	commit := func() (err error) {
		if tx != nil {
			err = tx.Commit()
			tx, size = nil, 0
		}
		return err
	}
	err = pages.entries(func(key, sealed []byte) (err error) {
		for _, bucket := range buckets[1:] {
			if _, err := unseal(bucket, key, sealed); err != nil {
				continue
			}
			if tx == nil {
				if tx, err = to.Begin(true); err != nil {
					return err
				}
			}
			if tx.Bucket(bucket).Get(key) != nil {
				return nil
			}
			if err := tx.Bucket(bucket).Put(key, sealed); err != nil {
				return err
			}
			kept++
			if size += len(key) + len(sealed); size > rewriteBytes {
				return commit()
			}
			return nil
		}
		return nil
	})
	return kept, errors.Join(err, commit())
}

// rewriteBytes is how much is written in one transaction when a database is
// rewritten, for it is in memory until then.
const rewriteBytes = 16 << 20

// compact gives the space of deleted entries back to the system. The caller
// holds the gate.
func (s *Store) compact() error {
	old, err := s.open(false) // keeps other processes out until the new one is in place
	if err != nil {
		return err
	}
	defer old.Close()
	return s.rewrite(func(fresh *bolt.DB) error { return bolt.Compact(fresh, old, rewriteBytes) })
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
