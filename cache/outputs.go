package cache

import (
	"crypto/rand"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"

	bolt "go.etcd.io/bbolt"
)

// largeOutput is the size above which an output is a file of its own.
const largeOutput = 64 << 10

// unfinished begins the name of a file that is being written.
const unfinished = "unfinished-"

// ErrMissing is returned when an output is not in the store.
var ErrMissing = errors.New("it is not in the store")

// DamagedError is returned when an output is in the store but its bytes are not
// the ones that were stored.
type DamagedError struct {
	Output Digest
	Where  string // the file
}

func (e *DamagedError) Error() string {
	return fmt.Sprintf("its stored bytes are damaged (%s in %s)", e.Output.Short(), e.Where)
}

func (s *Store) outputDir() string { return filepath.Join(s.dir, "outputs") }

// outputPath spreads the files over 256 folders.
func (s *Store) outputPath(d Digest) string {
	name := d.String()
	return filepath.Join(s.outputDir(), name[:2], name)
}

// writeOutput writes a large output so that either all of it is there under its
// name, whatever happens, or nothing is.
func (s *Store) writeOutput(d Digest, output []byte) error {
	path := s.outputPath(d)
	dir := filepath.Dir(path)
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return err
	}
	f, err := os.OpenFile(filepath.Join(s.outputDir(), unfinished+rand.Text()), os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o666)
	if err != nil {
		return err
	}
	_, err = f.Write(output)
	if err == nil {
		err = f.Sync()
	}
	if closing := f.Close(); err == nil {
		err = closing
	}
	if err == nil {
		err = os.Rename(f.Name(), path)
	}
	if err != nil {
		os.Remove(f.Name())
		return err
	}
	if err := syncDir(dir); err != nil {
		return err
	}
	return syncDir(s.outputDir())
}

// outputSize is the size of the file that holds a large output, -1 without one.
func (s *Store) outputSize(d Digest) int64 {
	info, err := os.Stat(s.outputPath(d))
	if err != nil {
		return -1
	}
	return info.Size()
}

// Output reads an output and verifies it. The error is ErrMissing, a
// *DamagedError or what kept the store from being read.
func (s *Store) Output(d Digest) ([]byte, error) {
	s.mu.Lock()
	kept, ok := s.outputs[d]
	s.mu.Unlock()
	if ok {
		return kept, nil
	}
	path := s.outputPath(d)
	output, err := os.ReadFile(path)
	if errors.Is(err, fs.ErrNotExist) {
		return s.smallOutput(d)
	}
	if err != nil {
		return nil, err
	}
	if DigestOf(output) != d {
		return nil, &DamagedError{d, path}
	}
	return output, nil
}

func (s *Store) smallOutput(d Digest) (output []byte, err error) {
	err = s.view(func(tx *bolt.Tx) (err error) {
		output, err = get(tx, outputBucket, d[:])
		return err
	})
	switch {
	case isDamage(err):
		s.damaged.Store(true)
		return nil, &DamagedError{d, s.database()}
	case errors.Is(err, errAbsent), err == nil && output == nil:
		return nil, ErrMissing
	case err == nil && DigestOf(output) != d:
		return nil, &DamagedError{d, s.database()}
	}
	return output, err
}
