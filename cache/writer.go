package cache

import (
	"errors"
	"io/fs"
	"syscall"

	bolt "go.etcd.io/bbolt"
)

// commit is something to be written. It may run more than once, each time in a
// transaction of its own.
type commit struct {
	write func(*bolt.Tx) error
	done  chan error
}

var errClosed = errors.New("the store is closed")

// commit has the writer run write in its next transaction and waits until that
// is on disk.
func (s *Store) commit(write func(*bolt.Tx) error) error {
	c := &commit{write, make(chan error, 1)}
	select {
	case s.queue <- c:
	case <-s.closing:
		return errClosed
	}
	select {
	case err := <-c.done:
		return err
	case <-s.stopped:
	}
	select {
	case err := <-c.done:
		return err
	default:
		return errClosed
	}
}

// write is the writer: it commits whatever is queued in one transaction, then
// whatever was queued in the meantime.
func (s *Store) write() {
	defer close(s.stopped)
	for {
		select {
		case c := <-s.queue:
			s.commitAll(append([]*commit{c}, s.queued()...))
		case <-s.closing:
			if rest := s.queued(); len(rest) > 0 {
				s.commitAll(rest)
			}
			return
		}
	}
}

// queued takes everything that waits.
func (s *Store) queued() (batch []*commit) {
	for range cap(s.queue) {
		select {
		case c := <-s.queue:
			batch = append(batch, c)
		default:
			return batch
		}
	}
	return batch
}

func (s *Store) commitAll(batch []*commit) {
	results := make([]error, len(batch))
	err := s.update(func(tx *bolt.Tx) error {
		for i, c := range batch {
			results[i] = c.write(tx)
		}
		return nil
	})
	for i, c := range batch {
		if err != nil {
			results[i] = err
		}
		c.done <- results[i]
	}
}

// failed decides what a failed write means: that nothing more can be stored, or
// only that this was not. Either is said once.
func (s *Store) failed(err error) error {
	var busy *busyError
	switch {
	case errors.Is(err, errGone), errors.Is(err, errClosed):
		return err
	case errors.As(err, &busy):
		s.warn("%v; what was computed meanwhile is kept in memory only", err)
		return err
	case errors.Is(err, syscall.ENOSPC), errors.Is(err, syscall.EDQUOT), errors.Is(err, syscall.EFBIG):
		s.warn("no space left to store results in %s (%v): they are kept in memory only; make room there or choose another folder with --cache", s.dir, err)
	case errors.Is(err, fs.ErrPermission), errors.Is(err, syscall.EROFS):
		s.warn("the store in %s cannot be written (%v): new results are kept in memory only; choose another folder with --cache to keep them", s.dir, err)
	default:
		s.warn("results cannot be stored in %s (%v): they are kept in memory only", s.dir, err)
	}
	s.mu.Lock()
	defer s.mu.Unlock()
	if s.readOnly == nil {
		s.readOnly = err
	}
	return err
}

// unwritable is why nothing can be stored, or nil.
func (s *Store) unwritable() error {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.readOnly
}
