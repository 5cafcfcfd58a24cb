package cache

import (
	"context"
	"crypto/sha256"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"

	bolt "go.etcd.io/bbolt"
)

// Checked is what a check of a store found.
type Checked struct {
	Records   int // that verify
	Outputs   int // that verify, small and large
	Weighings int // that verify
	Bytes     int64
	Problems  []string // one sentence each; none when all is well

	sound   map[Digest]bool
	wanting []*Record // whose outputs were not among the sound ones
}

func (c *Checked) problem(format string, args ...any) {
	c.Problems = append(c.Problems, fmt.Sprintf(format, args...))
}

// Check reads everything in the store and verifies every checksum. With repair,
// damaged entries are removed, so that what they held is computed again when it
// is needed; without, nothing is changed. No lock is held for long: others may
// use the store meanwhile.
func (s *Store) Check(ctx context.Context, repair bool) (*Checked, error) {
	c := &Checked{sound: map[Digest]bool{}}
	if err := s.checkFiles(ctx, c, repair); err != nil {
		return nil, err
	}
	for _, bucket := range [][]byte{outputBucket, recordBucket, historyBucket, nameBucket, usedBucket, kindBucket, fileBucket} {
		if err := s.checkBucket(ctx, c, bucket); err != nil {
			return nil, err
		}
	}
	for _, r := range c.wanting { // perhaps stored since we looked
		if _, err := s.Output(r.Output); err != nil {
			c.problem("the output of %s (%s) cannot be used: %v", r.Name.Node, r.Output.Short(), err)
		}
	}
	if repair && s.damaged.Load() {
		return c, s.update(func(*bolt.Tx) error { return nil })
	}
	return c, nil
}

func (s *Store) checkBucket(ctx context.Context, c *Checked, bucket []byte) error {
	err := s.scan(bucket, func(key, value []byte, damage error) error {
		if err := ctx.Err(); err != nil {
			return err
		}
		if damage != nil {
			c.problem("an entry among the %s in the database is damaged: %v", bucket, damage)
			return nil
		}
		switch string(bucket) {
		case string(outputBucket):
			c.Bytes += int64(len(value))
			if d := Digest(key); DigestOf(value) == d {
				c.Outputs++
				c.sound[d] = true
			} else {
				c.problem("the stored output %s is damaged", d.Short())
			}
		case string(recordBucket):
			r, err := DecodeRecord(value)
			if err != nil {
				c.problem("the record %s cannot be read: %v", Key(key).Short(), err)
				return nil
			}
			c.Records++
			if !c.sound[r.Output] {
				c.wanting = append(c.wanting, r)
			}
		case string(historyBucket):
			if _, err := decodeWeighing(key, value); err != nil {
				c.problem("an entry in the history of weighings cannot be read: %v", err)
				return nil
			}
			c.Weighings++
		}
		return nil
	})
	if isDamage(err) {
		c.problem("pages of the database that hold %s cannot be read: %v", bucket, err)
		return nil
	}
	return err
}

// checkFiles verifies the outputs that are files.
func (s *Store) checkFiles(ctx context.Context, c *Checked, repair bool) error {
	err := filepath.WalkDir(s.outputDir(), func(path string, entry fs.DirEntry, err error) error {
		if errors.Is(err, fs.ErrNotExist) || err == nil && (entry.IsDir() || strings.HasPrefix(entry.Name(), unfinished)) {
			return nil
		}
		if err != nil {
			return err
		}
		if err := ctx.Err(); err != nil {
			return err
		}
		d, size, err := digestOfFile(path)
		switch {
		case err != nil:
			c.problem("the stored output %s cannot be read: %v", path, err)
		case d.String() != entry.Name():
			c.problem("the stored output %s is damaged", path)
		default:
			c.Outputs++
			c.Bytes += size
			c.sound[d] = true
			return nil
		}
		if repair {
			return os.Remove(path)
		}
		return nil
	})
	return err
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
