package cache

import (
	"crypto/rand"
	"errors"
	"os"
	"time"

	bolt "go.etcd.io/bbolt"
)

// freshSuffix and damagedSuffix name what lies beside the database while it is
// rewritten and after it was found damaged.
const (
	freshSuffix   = ".new-"
	damagedSuffix = ".damaged"
)

// stale is how old what nobody refers to must be before it counts as abandoned
// and not as being written by another process.
const stale = time.Hour

// rebuild replaces a damaged database by a new one with every value that still
// verifies. The damaged file is kept beside it until the store is trimmed. The
// caller holds the gate.
func (s *Store) rebuild() error { return guard(s.rebuildIt) }

func (s *Store) rebuildIt() error {
	path := s.database()
	old, err := s.lockDatabase()
	if err != nil {
		return err
	}
	defer old.Close()
	data, release, err := contents(old)
	if err != nil {
		return err
	}
	defer release()
	if intact(data) { // another process was faster
		s.damaged.Store(false)
		return nil
	}
	kept := 0
	err = s.rewrite(func(fresh *bolt.DB) (err error) {
		if err := fresh.Update(s.prepare); err != nil {
			return err
		}
		if kept, err = salvage(fresh, data); err != nil {
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

// lockDatabase opens the database's file, as it is, and keeps other processes
// out until it is closed.
func (s *Store) lockDatabase() (*os.File, error) {
	for start := time.Now(); ; time.Sleep(5 * time.Millisecond) {
		file, err := os.OpenFile(s.database(), os.O_RDWR|os.O_CREATE, 0o666)
		if err != nil {
			return nil, err
		}
		locked, err := tryLock(file)
		switch {
		case err != nil:
			file.Close()
			return nil, err
		case locked && sameFile(file, s.database()):
			return file, nil
		case time.Since(start) > s.o.Wait:
			file.Close()
			return nil, &busyError{s.database(), s.o.Wait}
		}
		file.Close()
	}
}

// intact says that the pages of a database and every value on them verify.
func intact(data []byte) bool {
	pages, err := newPageFile(data)
	if err != nil || pages.check() != nil {
		return false
	}
	return pages.entries(true, func(key, sealed []byte) error {
		if bucketOf(key, sealed) == nil {
			return errors.New("damaged")
		}
		return nil
	}) == nil
}

// bucketOf is the bucket for which a value is sealed, nil when for none.
func bucketOf(key, sealed []byte) []byte {
	for _, bucket := range buckets {
		if _, err := unseal(bucket, key, sealed); err == nil {
			return bucket
		}
	}
	return nil
}

// rewrite puts a new database, filled by fill, in the place of the old one. Other
// processes that wait for the old one's lock notice and open the new one.
func (s *Store) rewrite(fill func(fresh *bolt.DB) error) error {
	path := s.database() + freshSuffix + rand.Text()
	fresh, err := bolt.Open(path, 0o666, &bolt.Options{Timeout: s.o.Wait, FreelistType: bolt.FreelistMapType})
	if err != nil {
		return err
	}
	err = fill(fresh)
	if closing := fresh.Close(); err == nil {
		err = closing
	}
	if err == nil {
		err = os.Rename(path, s.database())
	}
	if err != nil {
		os.Remove(path)
		return err
	}
	return syncDir(s.dir)
}

// salvage copies the values that verify from a damaged file into a prepared
// database and counts them: first those on pages in use, then those on all
// others, among them older states. The error is one of writing.
func salvage(to *bolt.DB, from []byte) (kept int, err error) {
	pages, _ := newPageFile(from)
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
	keep := func(key, sealed []byte) (err error) {
		bucket := bucketOf(key, sealed)
		if bucket == nil {
			return nil
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
	for _, live := range []bool{true, false} {
		if err := pages.entries(live, keep); err != nil {
			return kept, err
		}
	}
	return kept, commit()
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
