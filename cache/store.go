// Package cache keeps what was computed, so that it is computed once.
//
// A store is a folder. One bbolt file in it holds the records (how each output
// came about, found by the hash of everything the output depends on), the small
// outputs, the digests of large input files and the history of weighings;
// outputs above 64 KiB are files named by the digest of their content. Every
// value carries a checksum that is verified whenever it is read: a damaged one
// counts as absent, is said to be damaged, and is never used.
//
// The bbolt file is open only while a transaction lasts, so that several
// processes work on one store side by side. A record is committed after its
// output is safely on disk: a process killed at any instant leaves a store with
// every finished record and no half-written one.
//
// A store that cannot be written (a read-only folder, a full disk) still reads
// what it holds and keeps new results in memory for as long as it is open; a
// store that cannot be read counts as empty. Both are said in Warnings.
//
// The folder must be on a local disk: bbolt's locks do not hold on network file
// systems. There, give each job a folder of its own and Absorb them afterwards.
package cache

import (
	"fmt"
	"path/filepath"
	"sync"
	"sync/atomic"
	"time"
)

// Options of a store; the zero value serves.
type Options struct {
	Limit int64            // size in bytes to which Close trims the store; 0 means no limit
	Wait  time.Duration    // how long to wait for another process's transaction; 0 means 5 s
	Now   func() time.Time // the clock; nil means time.Now
}

// Store is an open store. It is safe for use by many goroutines.
type Store struct {
	dir  string
	o    Options
	gate sync.RWMutex // transactions of this process: many readers or the writer

	queue   chan *commit  // what waits for the writer
	closing chan struct{} // closed by Close
	stopped chan struct{} // closed when the writer has ended
	once    sync.Once

	sound   atomic.Bool // the database's pages were checked in this process
	damaged atomic.Bool // some value in the database did not verify
	grown   atomic.Bool // something was stored

	mu       sync.Mutex // guards what follows
	warnings []string
	said     map[string]bool // warnings given already
	readOnly error           // why nothing can be stored any more, or nil
	records  map[Key]*Record // what could not be stored
	outputs  map[Digest][]byte
}

// Open gives the store in folder dir, which is made when first written to. The
// only error is a store that a newer program wrote; anything else that is wrong
// with the folder is a warning and costs only what was stored.
func Open(dir string, o Options) (*Store, error) {
	if o.Wait == 0 {
		o.Wait = 5 * time.Second
	}
	if o.Now == nil {
		o.Now = time.Now
	}
	dir, err := filepath.Abs(dir)
	if err != nil {
		return nil, fmt.Errorf("cache: %w", err)
	}
	s := &Store{
		dir:     dir,
		o:       o,
		queue:   make(chan *commit, 1024),
		closing: make(chan struct{}),
		stopped: make(chan struct{}),
		said:    map[string]bool{},
		records: map[Key]*Record{},
		outputs: map[Digest][]byte{},
	}
	var newer *newerError
	if err := s.View(func(*Reader) error { return nil }); asError(err, &newer) {
		return nil, err
	}
	go s.write()
	return s, nil
}

// Dir is the store's folder.
func (s *Store) Dir() string { return s.dir }

// Close waits until everything queued is committed, and trims the store to its
// limit if this process has added to it. The store must not be used afterwards.
func (s *Store) Close() (err error) {
	s.once.Do(func() {
		close(s.closing)
		<-s.stopped
		if s.o.Limit <= 0 || !s.grown.Load() {
			return
		}
		size, sizeErr := s.bytes()
		if err = sizeErr; err == nil && size > s.o.Limit {
			// A tenth less, so that the next small run need not trim again.
			_, err = s.Trim(Trim{Bytes: s.o.Limit - s.o.Limit/10})
		}
	})
	return err
}

// Warnings gives what went wrong since it was last asked, each problem once.
func (s *Store) Warnings() []string {
	s.mu.Lock()
	defer s.mu.Unlock()
	w := s.warnings
	s.warnings = nil
	return w
}

func (s *Store) warn(format string, args ...any) {
	text := fmt.Sprintf(format, args...)
	s.mu.Lock()
	defer s.mu.Unlock()
	if !s.said[text] {
		s.said[text] = true
		s.warnings = append(s.warnings, text)
	}
}
