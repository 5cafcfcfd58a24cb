package cache

import (
	"bytes"
	"context"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"maps"
	"os"
	"path/filepath"
	"slices"

	bolt "go.etcd.io/bbolt"
)

// Checked is what a check of a store found.
type Checked struct {
	Records   int // that verify
	Outputs   int // that verify, small and large
	Weighings int // that verify
	Bytes     int64
	Problems  []string // one sentence each; none when all is well
}

// Check reads everything in the store and verifies every checksum. With repair,
// damaged entries are removed, so that what they held is computed again when it
// is needed; without, nothing is changed. No lock is held for long: others may
// use the store meanwhile.
func (s *Store) Check(ctx context.Context, repair bool) (*Checked, error) {
	c := &checker{store: s, sound: map[Digest]bool{}, wanting: map[Digest]string{}}
	if err := c.files(ctx, repair); err != nil {
		return nil, err
	}
	for _, bucket := range [][]byte{outputBucket, recordBucket, historyBucket, nameBucket, usedBucket, kindBucket, fileBucket} {
		if err := c.bucket(ctx, bucket); err != nil {
			return nil, err
		}
	}
	lost := map[Digest]bool{}
	for _, d := range slices.SortedFunc(maps.Keys(c.wanting), func(a, b Digest) int { return bytes.Compare(a[:], b[:]) }) {
		if _, err := s.Output(d); err != nil { // and was not stored since we looked
			c.problem("the output of %s (%s) cannot be used: %v", c.wanting[d], d.Short(), err)
			lost[d] = true
		}
	}
	if repair && (s.damaged.Load() || len(lost) > 0) {
		return &c.Checked, s.update(func(tx *bolt.Tx) error { return removeLost(tx, lost) })
	}
	return &c.Checked, nil
}

// removeLost removes the records and weighings whose outputs are lost.
func removeLost(tx *bolt.Tx, lost map[Digest]bool) error {
	if len(lost) == 0 {
		return nil
	}
	records := deleteWhere(tx, recordBucket, func(key, sealed []byte) bool {
		value, err := unseal(recordBucket, key, sealed)
		if err != nil {
			return false
		}
		r, err := DecodeRecord(value)
		return err == nil && lost[r.Output]
	})
	weighings := deleteWhere(tx, historyBucket, func(key, sealed []byte) bool {
		value, err := unseal(historyBucket, key, sealed)
		if err != nil {
			return false
		}
		w, err := decodeWeighing(key, value)
		return err == nil && lost[w.Body]
	})
	return errors.Join(records, weighings)
}

type checker struct {
	Checked
	store   *Store
	sound   map[Digest]bool   // outputs that verify
	wanting map[Digest]string // outputs not among them -> whose they are
}

func (c *checker) problem(format string, args ...any) {
	c.Problems = append(c.Problems, fmt.Sprintf(format, args...))
}

// want notes that an output is referred to.
func (c *checker) want(d Digest, whose string) {
	if !c.sound[d] {
		c.wanting[d] = whose
	}
}

// bucket verifies the entries of a bucket.
func (c *checker) bucket(ctx context.Context, bucket []byte) error {
	err := c.store.scan(bucket, func(key, value []byte, damage error) error {
		if damage != nil {
			c.problem("an entry among the %s in the database is damaged: %v", bucket, damage)
			return ctx.Err()
		}
		switch string(bucket) {
		case string(outputBucket):
			c.output(Digest(key), DigestOf(value), int64(len(value)), "the database")
		case string(recordBucket):
			if r, err := DecodeRecord(value); err != nil {
				c.problem("the record %s cannot be read: %v", Key(key).Short(), err)
			} else {
				c.Records++
				c.want(r.Output, r.Name.Node)
			}
		case string(historyBucket):
			if w, err := decodeWeighing(key, value); err != nil {
				c.problem("an entry in the history of weighings cannot be read: %v", err)
			} else {
				c.Weighings++
				c.want(w.Body, fmt.Sprintf("weighing %d of %s", w.Number, w.Recipe))
			}
		}
		return ctx.Err()
	})
	if isDamage(err) {
		c.problem("pages of the database that hold %s cannot be read: %v", bucket, err)
		return nil
	}
	return err
}

// output counts an output if it is what its name says.
func (c *checker) output(name, content Digest, size int64, where string) bool {
	if content != name {
		c.problem("the stored output %s in %s is damaged", name.Short(), where)
		return false
	}
	c.Outputs++
	c.Bytes += size
	c.sound[name] = true
	return true
}

// files verifies the outputs that are files.
func (c *checker) files(ctx context.Context, repair bool) error {
	return filepath.WalkDir(c.store.outputDir(), func(path string, entry fs.DirEntry, err error) error {
		if errors.Is(err, fs.ErrNotExist) || err == nil && entry.IsDir() {
			return nil
		}
		if err != nil {
			return err
		}
		name, err := hex.DecodeString(entry.Name())
		if err != nil || len(name) != len(Digest{}) { // being written, or none of ours
			return ctx.Err()
		}
		content, size, err := digestOfFile(path)
		switch {
		case errors.Is(err, fs.ErrNotExist): // removed since
		case err != nil:
			c.problem("the stored output %s cannot be read: %v", path, err)
		case !c.output(Digest(name), content, size, path) && repair:
			return os.Remove(path)
		}
		return ctx.Err()
	})
}

func digestOfFile(path string) (d Digest, size int64, err error) {
	f, err := os.Open(path)
	if err != nil {
		return d, 0, err
	}
	defer f.Close()
	h := sha256.New()
	size, err = io.Copy(h, f)
	return Digest(h.Sum(nil)), size, err
}
