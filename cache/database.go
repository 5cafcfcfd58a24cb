package cache

import (
	"encoding/binary"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"runtime/debug"
	"syscall"
	"time"

	bolt "go.etcd.io/bbolt"
	bolterrors "go.etcd.io/bbolt/errors"
)

// schema is the version of the database's layout, kept in its meta bucket.
const schema = 1

var (
	metaBucket    = []byte("meta")    // schema
	recordBucket  = []byte("records") // key -> record
	outputBucket  = []byte("outputs") // digest -> small output
	nameBucket    = []byte("names")   // recipe and node -> last key and the one before
	usedBucket    = []byte("used")    // key -> when last used
	kindBucket    = []byte("kinds")   // kind -> seconds it last took
	fileBucket    = []byte("files")   // path -> identity and digest of a large input file
	historyBucket = []byte("history") // recipe and number -> weighing

	buckets   = [][]byte{metaBucket, recordBucket, outputBucket, nameBucket, usedBucket, kindBucket, fileBucket, historyBucket}
	schemaKey = []byte("schema")
)

// errAbsent says that there is no database yet.
var errAbsent = errors.New("no store there yet")

// damageError says that the database, or a value in it, cannot be believed.
type damageError struct{ reason string }

func (e *damageError) Error() string { return e.reason }

// newerError says that a newer program wrote the database.
type newerError struct {
	dir  string
	have uint64
}

func (e *newerError) Error() string {
	return fmt.Sprintf("the store in %s was written by a newer version of this program (layout %d, this one knows %d): update the program or choose another folder with --cache",
		e.dir, e.have, schema)
}

// busyError says that other processes held the database for too long.
type busyError struct {
	path string
	wait time.Duration
}

func (e *busyError) Error() string {
	return fmt.Sprintf("another process has held %s for more than %v: wait until it has finished, or choose another folder with --cache",
		e.path, e.wait)
}

func asError[T error](err error, target *T) bool { return errors.As(err, target) }

func isDamage(err error) bool {
	var damage *damageError
	return errors.As(err, &damage)
}

func (s *Store) database() string { return filepath.Join(s.dir, "store.db") }

// view runs fn in a reading transaction. fn must copy what it keeps and must
// not begin another transaction.
func (s *Store) view(fn func(*bolt.Tx) error) error {
	s.gate.RLock()
	defer s.gate.RUnlock()
	return s.transact(true, fn)
}

// update runs fn in a writing transaction, after rebuilding a database in which
// damage was found. It may run fn twice.
func (s *Store) update(fn func(*bolt.Tx) error) error {
	s.gate.Lock()
	defer s.gate.Unlock()
	if err := os.MkdirAll(s.dir, 0o777); err != nil {
		return err
	}
	if s.damaged.Load() {
		if err := s.rebuild(); err != nil {
			return err
		}
	}
	_, missing := os.Stat(s.database())
	err := s.transact(false, fn)
	if isDamage(err) {
		if err := s.rebuild(); err != nil {
			return err
		}
		err = s.transact(false, fn)
	}
	if err == nil && missing != nil {
		err = syncDir(s.dir) // so that the new file itself is there after a power cut
	}
	return err
}

// transact opens the database, runs one transaction and closes it again.
func (s *Store) transact(readOnly bool, fn func(*bolt.Tx) error) error {
	err := guard(func() error {
		if !s.sound.Load() {
			if err := s.checkPages(); err != nil && !errors.Is(err, errAbsent) {
				return err
			}
		}
		db, err := s.open(readOnly)
		if err != nil {
			return err
		}
		defer db.Close()
		if readOnly {
			return db.View(func(tx *bolt.Tx) error {
				if err := s.checkSchema(tx); err != nil {
					return err
				}
				return fn(tx)
			})
		}
		return db.Update(func(tx *bolt.Tx) error {
			if err := s.prepare(tx); err != nil {
				return err
			}
			return fn(tx)
		})
	})
	if isDamage(err) {
		s.sound.Store(false)
	}
	return err
}

// checkPages makes sure that bbolt can be trusted with the database. Opening it
// for reading looks at nothing but its first two pages.
func (s *Store) checkPages() error {
	db, err := s.open(true)
	if err != nil {
		return err
	}
	defer db.Close()
	file, err := os.Open(s.database())
	if err != nil {
		return err
	}
	defer file.Close()
	data, release, err := contents(file)
	if err != nil {
		return err
	}
	defer release()
	pages, err := newPageFile(data)
	if err == nil {
		err = pages.check()
	}
	if err != nil {
		return &damageError{err.Error()}
	}
	s.sound.Store(true)
	return nil
}

// guard turns what bbolt does on a damaged file, a panic or a fault on a mapped
// page that is gone, into an error.
func guard(fn func() error) (err error) {
	defer debug.SetPanicOnFault(debug.SetPanicOnFault(true))
	defer func() {
		if p := recover(); p != nil {
			err = &damageError{fmt.Sprint(p)}
		}
	}()
	return fn()
}

// open opens the database, waiting for other processes for at most Options.Wait.
func (s *Store) open(readOnly bool) (*bolt.DB, error) {
	path := s.database()
	start, pause := time.Now(), time.Millisecond
	for {
		if readOnly {
			info, err := os.Stat(path)
			if errors.Is(err, fs.ErrNotExist) || errors.Is(err, syscall.ENOTDIR) || err == nil && info.Size() == 0 {
				return nil, errAbsent
			}
		}
		db, file, err := openDatabase(path, readOnly)
		switch {
		case err == nil && sameFile(file, path):
			return db, nil
		case err == nil: // replaced while we waited for its lock: open the new one
			db.Close()
		case errors.Is(err, bolterrors.ErrTimeout):
			if time.Since(start) > s.o.Wait {
				return nil, &busyError{path, s.o.Wait}
			}
			time.Sleep(pause)
			pause = min(2*pause, 20*time.Millisecond)
		default:
			return nil, err
		}
	}
}

// openDatabase makes one attempt. Should bbolt panic over a damaged file, the
// file and with it the lock are let go.
func openDatabase(path string, readOnly bool) (db *bolt.DB, file *os.File, err error) {
	defer func() {
		if p := recover(); p != nil {
			db, err = nil, &damageError{fmt.Sprint(p)}
		}
		if err != nil && file != nil {
			file.Close()
		}
	}()
	db, err = bolt.Open(path, 0o666, &bolt.Options{
		ReadOnly:     readOnly,
		Timeout:      time.Nanosecond, // one attempt; open waits, in shorter steps than bbolt's
		FreelistType: bolt.FreelistMapType,
		NoStatistics: true,
		OpenFile: func(name string, flag int, mode os.FileMode) (*os.File, error) {
			file, err = os.OpenFile(name, flag, mode)
			return file, err
		},
	})
	var pathError *fs.PathError
	var errno syscall.Errno
	if err != nil && !errors.Is(err, bolterrors.ErrTimeout) && !errors.As(err, &pathError) && !errors.As(err, &errno) {
		err = &damageError{err.Error()} // not a database, or no longer one
	}
	return db, file, err
}

func sameFile(file *os.File, path string) bool {
	a, err := file.Stat()
	if err != nil {
		return false
	}
	b, err := os.Stat(path)
	return err == nil && os.SameFile(a, b)
}

// checkSchema refuses a database that a newer program wrote. One without a
// schema was never written to.
func (s *Store) checkSchema(tx *bolt.Tx) error {
	meta := tx.Bucket(metaBucket)
	if meta == nil {
		return nil
	}
	value := meta.Get(schemaKey)
	if value == nil {
		return nil
	}
	number, err := unseal(metaBucket, schemaKey, value)
	if err != nil || len(number) != 8 {
		return &damageError{"its layout number is damaged"}
	}
	if have := binary.BigEndian.Uint64(number); have > schema {
		return &newerError{s.dir, have}
	}
	return nil
}

// prepare makes a new database ready for writing.
func (s *Store) prepare(tx *bolt.Tx) error {
	if err := s.checkSchema(tx); err != nil {
		return err
	}
	for _, name := range buckets {
		if _, err := tx.CreateBucketIfNotExists(name); err != nil {
			return err
		}
	}
	if tx.Bucket(metaBucket).Get(schemaKey) != nil {
		return nil
	}
	return put(tx, metaBucket, schemaKey, binary.BigEndian.AppendUint64(nil, schema))
}
