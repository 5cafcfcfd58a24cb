package cache

import (
	"context"
	"crypto/sha256"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"sync"
	"time"

	bolt "go.etcd.io/bbolt"
)

// largeFile is the size from which a file's digest is remembered between runs;
// a smaller one is read again faster than the answer is written down.
const largeFile = 1 << 20

// settleTime is how old a file's last change must be before its time can be
// trusted to tell a later change from this one.
const settleTime = 2 * time.Second

// identity is what the file system says of a file: a file with the same
// identity, once settled, has the same content.
type identity struct {
	size          int64
	modified      int64 // ns
	changed       int64 // ns; 0 where the system does not say
	device, inode uint64
	settled       bool // was already old when the file was read
}

// FileState is a file as it was when it was read.
type FileState struct {
	Path   string
	Digest Digest
	id     identity
}

// Again looks at the file once more: it gives the state to compare with from now
// on, or an error when the file no longer holds the bytes that were read. A file
// that was merely touched is read again and found the same.
func (f *FileState) Again(ctx context.Context) (*FileState, error) {
	if f.unmoved() {
		return f, nil
	}
	again, err := readFile(ctx, f.Path, time.Now)
	if err != nil {
		return nil, err
	}
	if again.Digest != f.Digest {
		return nil, fmt.Errorf("%s has changed since this run began: run again", f.Path)
	}
	return again, nil
}

// unmoved says that by all signs nobody wrote to the file since it was read.
func (f *FileState) unmoved() bool {
	info, err := os.Stat(f.Path)
	if err != nil {
		return false
	}
	now := identify(info)
	now.settled = true
	return now == f.id
}

// Same says whether two states are of a file that was not even touched between
// them.
func (f *FileState) Same(g *FileState) bool {
	a, b := f.id, g.id
	a.settled, b.settled = true, true
	return a == b && f.Digest == g.Digest
}

// FileDigests reads files and gives their states and errors, each at the place
// of its path. Unchanged large files are not read again. At most workers files
// are read at a time.
func (s *Store) FileDigests(ctx context.Context, paths []string, workers int) ([]*FileState, []error) {
	states, errs := make([]*FileState, len(paths)), make([]error, len(paths))
	fresh := make([]bool, len(paths))
	s.recall(paths, states)
	var wg sync.WaitGroup
	slots := make(chan struct{}, max(1, workers))
	for i, path := range paths {
		if states[i] != nil {
			continue
		}
		slots <- struct{}{}
		wg.Go(func() {
			defer func() { <-slots }()
			states[i], errs[i] = readFile(ctx, path, s.o.Now)
			fresh[i] = errs[i] == nil && states[i].id.size >= largeFile && states[i].id.settled
		})
	}
	wg.Wait()
	var memo []*FileState
	for i := range paths {
		if fresh[i] {
			memo = append(memo, states[i])
		}
	}
	s.memorise(memo)
	return states, errs
}

// recall fills in the states of large files that were read before and have not
// changed since.
func (s *Store) recall(paths []string, states []*FileState) {
	ids := make(map[int]identity)
	for i, path := range paths {
		info, err := os.Stat(path)
		if err == nil && info.Mode().IsRegular() && info.Size() >= largeFile {
			ids[i] = identify(info)
		}
	}
	if len(ids) == 0 {
		return
	}
	s.View(func(r *Reader) error {
		for i, path := range paths {
			id, ok := ids[i]
			if !ok {
				continue
			}
			value, err := r.get(fileBucket, fileKey(path))
			if err != nil || value == nil {
				continue
			}
			d := decoder{rest: value}
			known := identity{d.int(), d.int(), d.int(), uint64(d.int()), uint64(d.int()), true}
			digest := d.digest()
			id.settled = true
			if d.end() == nil && known == id {
				states[i] = &FileState{path, digest, id}
			}
		}
		return nil
	})
}

// memorise keeps the digests of large files for the next run.
func (s *Store) memorise(states []*FileState) {
	if len(states) == 0 || s.unwritable() != nil {
		return
	}
	err := s.commit(func(tx *bolt.Tx) error {
		for _, f := range states {
			var b []byte
			for _, n := range []int64{f.id.size, f.id.modified, f.id.changed, int64(f.id.device), int64(f.id.inode)} {
				b = putInt(b, n)
			}
			if err := put(tx, fileBucket, fileKey(f.Path), append(b, f.Digest[:]...)); err != nil {
				return err
			}
		}
		return nil
	})
	if err != nil {
		s.failed(err)
	}
}

// fileKey keeps the key of a long path within what bbolt allows.
func fileKey(path string) []byte {
	if whole, err := filepath.Abs(path); err == nil {
		path = whole
	}
	key := sha256.Sum256([]byte(path))
	return key[:]
}

// readFile hashes a regular file that does not change meanwhile.
func readFile(ctx context.Context, path string, now func() time.Time) (*FileState, error) {
	for range 3 {
		f, err := readOnce(ctx, path, now)
		if !errors.Is(err, errMoving) {
			return f, err
		}
	}
	return nil, fmt.Errorf("%s is being written to: run again when it is finished", path)
}

var errMoving = errors.New("file changed while it was read")

func readOnce(ctx context.Context, path string, now func() time.Time) (*FileState, error) {
	info, err := os.Stat(path) // before opening: opening a pipe waits
	if err != nil {
		return nil, err
	}
	if !info.Mode().IsRegular() {
		return nil, fmt.Errorf("%s is not an ordinary file", path)
	}
	file, err := os.Open(path)
	if err != nil {
		return nil, err
	}
	defer file.Close()
	started := now()
	before, err := file.Stat()
	if err != nil {
		return nil, err
	}
	h, buffer := sha256.New(), make([]byte, min(1<<20, max(4<<10, before.Size()+1)))
	for {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		n, err := file.Read(buffer)
		h.Write(buffer[:n])
		if err == io.EOF {
			break
		}
		if err != nil {
			return nil, err
		}
	}
	after, err := file.Stat()
	if err != nil {
		return nil, err
	}
	id := identify(before)
	if id != identify(after) {
		return nil, errMoving
	}
	age := started.Sub(time.Unix(0, max(id.modified, id.changed)))
	id.settled = age >= settleTime
	return &FileState{path, Digest(h.Sum(nil)), id}, nil
}
