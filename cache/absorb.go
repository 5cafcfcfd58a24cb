package cache

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"

	bolt "go.etcd.io/bbolt"
)

// Absorbed is what a store took over from another.
type Absorbed struct {
	Records   int // that were new here
	Weighings int // that were new here
	Bytes     int64
	Skipped   int // damaged or incomplete there
}

// Absorb copies what another store holds and this one does not. The other store
// is left as it is.
func (s *Store) Absorb(ctx context.Context, dir string) (*Absorbed, error) {
	if a, err := filepath.Abs(dir); err == nil && a == s.dir {
		return nil, errors.New("a store cannot absorb itself")
	}
	other, err := Open(dir, Options{Wait: s.o.Wait, Now: s.o.Now})
	if err != nil {
		return nil, err
	}
	defer other.Close()
	if _, err := os.Stat(other.database()); err != nil {
		return nil, fmt.Errorf("there is no store in %s: %w", dir, err)
	}
	a := &Absorbed{}
	for _, step := range []func(context.Context, *Store, *Absorbed) error{s.absorbRecords, s.absorbNames, s.absorbHistory} {
		if err := step(ctx, other, a); err != nil {
			return a, err
		}
	}
	for _, w := range other.Warnings() {
		s.warn("%s", w)
	}
	return a, nil
}

// Records are taken over in batches of this many, or of this many bytes.
const (
	batchRecords = 500
	batchBytes   = 32 << 20
)

func (s *Store) absorbRecords(ctx context.Context, other *Store, a *Absorbed) error {
	var batch []*Record
	flush := func() error {
		err := s.absorbBatch(ctx, other, a, batch)
		batch = batch[:0]
		return err
	}
	err := other.tolerate(other.scan(recordBucket, func(key, value []byte, damage error) error {
		r, err := DecodeRecord(value)
		if damage != nil || err != nil {
			a.Skipped++
			return nil
		}
		if batch = append(batch, r); len(batch) < batchRecords {
			return nil
		}
		return flush()
	}))
	if err != nil {
		return err
	}
	return flush()
}

func (s *Store) absorbBatch(ctx context.Context, other *Store, a *Absorbed, batch []*Record) error {
	err := s.View(func(reader *Reader) error {
		batch = slices.DeleteFunc(batch, func(r *Record) bool {
			have, _ := reader.Record(r.Key())
			return have != nil
		})
		return nil
	})
	for err == nil && len(batch) > 0 {
		if err = ctx.Err(); err != nil {
			break
		}
		var records []*Record
		var outputs [][]byte
		size := int64(0)
		for len(batch) > 0 && size < batchBytes {
			r := batch[0]
			batch = batch[1:]
			output, err := other.Output(r.Output)
			if err != nil {
				a.Skipped++
				continue
			}
			if len(output) > largeOutput {
				if err := s.writeOutput(r.Output, output); err != nil {
					return s.failed(err)
				}
			}
			records, outputs, size = append(records, r), append(outputs, output), size+r.Size
		}
		now := s.o.Now()
		err = s.commit(func(tx *bolt.Tx) error {
			for i, r := range records {
				if err := s.putRecord(tx, r, outputs[i]); err != nil {
					return err
				}
				if err := noteUse(tx, r.Key(), now); err != nil {
					return err
				}
			}
			return nil
		})
		if err != nil {
			return s.failed(err)
		}
		a.Records += len(records)
		a.Bytes += size
	}
	return err
}

// absorbNames takes over what names stand for that mean nothing here yet.
func (s *Store) absorbNames(ctx context.Context, other *Store, _ *Absorbed) error {
	names := map[string][]byte{}
	err := other.tolerate(other.scan(nameBucket, func(key, value []byte, damage error) error {
		if damage == nil {
			names[string(key)] = value
		}
		return ctx.Err()
	}))
	if err != nil || len(names) == 0 {
		return err
	}
	err = s.commit(func(tx *bolt.Tx) error {
		for name, value := range names {
			if tx.Bucket(nameBucket).Get([]byte(name)) != nil {
				continue
			}
			if err := put(tx, nameBucket, []byte(name), value); err != nil {
				return err
			}
		}
		return nil
	})
	if err != nil {
		return s.failed(err)
	}
	return nil
}

// absorbHistory appends the weighings that are not recorded here.
func (s *Store) absorbHistory(ctx context.Context, other *Store, a *Absorbed) error {
	here, err := s.History("")
	if err != nil {
		return err
	}
	there, err := other.History("")
	if err != nil {
		return err
	}
	same := func(w Weighing) func(Weighing) bool {
		return func(h Weighing) bool {
			return h.Recipe == w.Recipe && h.Finished.Equal(w.Finished) && h.Body == w.Body
		}
	}
	for _, w := range there {
		if err := ctx.Err(); err != nil {
			return err
		}
		if slices.ContainsFunc(here, same(w)) {
			continue
		}
		body, err := other.Output(w.Body)
		if err != nil {
			a.Skipped++
			continue
		}
		if _, err := s.Remember(w, body); err != nil {
			return err
		}
		a.Weighings++
	}
	return nil
}
