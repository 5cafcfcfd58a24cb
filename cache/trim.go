package cache

import (
	"bytes"
	"encoding/binary"
	"encoding/hex"
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"time"

	bolt "go.etcd.io/bbolt"
)

// Trim says what to remove from a store. The history of weighings always stays.
type Trim struct {
	Before  time.Time // what was last used before then goes
	Recipes []string  // what only these recipes used last goes
	Bytes   int64     // then the longest unused goes until the folder is no larger than this; 0 means no limit
}

// Trimmed is what a trim removed.
type Trimmed struct {
	Records int
	Bytes   int64 // by which the folder became smaller
}

// Trim removes records, the outputs that no other record has, and what was left
// behind by killed processes, and gives the space back to the system. What is
// removed is computed again when it is needed.
func (s *Store) Trim(t Trim) (*Trimmed, error) {
	before, err := s.bytes()
	if err != nil || before == 0 {
		return &Trimmed{}, err
	}
	trimmed := &Trimmed{}
	// The database takes more than what is in it: once it is seen how much
	// more, less is kept.
	for pass := t; ; {
		records, held, err := s.trim(pass)
		if err != nil {
			return trimmed, err
		}
		after, err := s.bytes()
		if err != nil {
			return trimmed, err
		}
		trimmed.Records += records
		trimmed.Bytes = before - after
		if t.Bytes <= 0 || after <= t.Bytes || pass.Bytes == 1 {
			return trimmed, nil
		}
		pass.Bytes = max(1, held-(after-t.Bytes))
	}
}

// trim removes what is to go, in one transaction, and compacts the database.
// Here t.Bytes counts outputs and records only, like the bytes still held.
func (s *Store) trim(t Trim) (records int, held int64, err error) {
	var victims []Key
	err = s.update(func(tx *bolt.Tx) error {
		in, err := inventoryOf(tx)
		if err != nil {
			return err
		}
		victims = in.choose(t)
		held = in.bytes
		for _, k := range victims {
			if err := in.remove(tx, k); err != nil {
				return err
			}
		}
		return errors.Join(in.removeNames(tx, t.Recipes), in.removeSmall(tx), s.removeFiles(in))
	})
	if err != nil {
		return 0, 0, err
	}
	s.gate.Lock()
	err = s.compact()
	s.gate.Unlock()
	if err != nil {
		return 0, 0, err
	}
	return len(victims), held, s.removeLeftovers()
}

// inventory is what the database holds, as far as trimming needs to know.
type inventory struct {
	records map[Key]*item
	outputs map[Digest]*share
	bytes   int64
}

type item struct {
	output  Digest
	bytes   int64 // of the record
	used    int64 // seconds
	recipes []string
}

// share is an output and how many records and weighings have it.
type share struct {
	users int
	bytes int64
}

func inventoryOf(tx *bolt.Tx) (*inventory, error) {
	in := &inventory{records: map[Key]*item{}, outputs: map[Digest]*share{}}
	err := each(tx, recordBucket, func(key, value []byte) error {
		r, err := DecodeRecord(value)
		if err != nil {
			return nil
		}
		in.records[Key(key)] = &item{output: r.Output, bytes: int64(len(value)), used: r.Finished.Unix()}
		in.bytes += int64(len(value))
		in.share(r.Output, r.Size)
		return nil
	})
	if err != nil {
		return nil, err
	}
	err = each(tx, usedBucket, func(key, value []byte) error {
		if r := in.records[Key(key)]; r != nil && len(value) == 8 {
			r.used = int64(binary.BigEndian.Uint64(value))
		}
		return nil
	})
	if err != nil {
		return nil, err
	}
	err = each(tx, nameBucket, func(key, value []byte) error {
		if name, err := nameOf(key); err == nil && len(value) >= len(Key{}) {
			if r := in.records[Key(value[:len(Key{})])]; r != nil {
				r.recipes = append(r.recipes, name.Recipe)
			}
		}
		return nil
	})
	if err != nil {
		return nil, err
	}
	return in, each(tx, historyBucket, func(key, value []byte) error {
		if w, err := decodeWeighing(key, value); err == nil {
			in.share(w.Body, w.Size)
		}
		return nil
	})
}

// each calls fn with every value of a bucket that verifies.
func each(tx *bolt.Tx, bucket []byte, fn func(key, value []byte) error) error {
	return tx.Bucket(bucket).ForEach(func(key, sealed []byte) error {
		value, err := unseal(bucket, key, sealed)
		if err != nil {
			return nil
		}
		return fn(key, value)
	})
}

func (in *inventory) share(d Digest, size int64) {
	if in.outputs[d] == nil {
		in.outputs[d] = &share{bytes: size}
		in.bytes += size
	}
	in.outputs[d].users++
}

// drop takes a record out of the inventory.
func (in *inventory) drop(k Key) {
	r := in.records[k]
	delete(in.records, k)
	in.bytes -= r.bytes
	o := in.outputs[r.output]
	if o.users--; o.users == 0 {
		in.bytes -= o.bytes
		delete(in.outputs, r.output)
	}
}

// choose takes what is to go out of the inventory, the longest unused first.
func (in *inventory) choose(t Trim) (victims []Key) {
	order := make([]Key, 0, len(in.records))
	for k := range in.records {
		order = append(order, k)
	}
	slices.SortFunc(order, func(a, b Key) int {
		if in.records[a].used != in.records[b].used {
			return int(min(1, max(-1, in.records[a].used-in.records[b].used)))
		}
		return bytes.Compare(a[:], b[:])
	})
	only := func(r *item) bool {
		return len(r.recipes) > 0 && !slices.ContainsFunc(r.recipes, func(name string) bool { return !slices.Contains(t.Recipes, name) })
	}
	gone := func(k Key) bool {
		r := in.records[k]
		if !t.Before.IsZero() && r.used < t.Before.Unix() || only(r) {
			victims = append(victims, k)
			in.drop(k)
			return true
		}
		return false
	}
	order = slices.DeleteFunc(order, gone)
	for _, k := range order {
		if t.Bytes <= 0 || in.bytes <= t.Bytes {
			break
		}
		victims = append(victims, k)
		in.drop(k)
	}
	return victims
}

func (in *inventory) remove(tx *bolt.Tx, k Key) error {
	if err := tx.Bucket(recordBucket).Delete(k[:]); err != nil {
		return err
	}
	return tx.Bucket(usedBucket).Delete(k[:])
}

// removeNames forgets what names stood for that is gone or belongs to recipes.
func (in *inventory) removeNames(tx *bolt.Tx, recipes []string) error {
	return deleteWhere(tx, nameBucket, func(key, sealed []byte) bool {
		name, err := nameOf(key)
		return err != nil || len(sealed) < len(Key{}) || in.records[Key(sealed[:len(Key{})])] == nil || slices.Contains(recipes, name.Recipe)
	})
}

// removeSmall removes small outputs that nothing has any more.
func (in *inventory) removeSmall(tx *bolt.Tx) error {
	return deleteWhere(tx, outputBucket, func(key, _ []byte) bool {
		return len(key) != len(Digest{}) || in.outputs[Digest(key)] == nil
	})
}

// deleteWhere collects first: a bucket must not change under its cursor.
func deleteWhere(tx *bolt.Tx, bucket []byte, where func(key, sealed []byte) bool) error {
	var keys [][]byte
	err := tx.Bucket(bucket).ForEach(func(key, sealed []byte) error {
		if where(key, sealed) {
			keys = append(keys, bytes.Clone(key))
		}
		return nil
	})
	if err != nil {
		return err
	}
	for _, key := range keys {
		if err := tx.Bucket(bucket).Delete(key); err != nil {
			return err
		}
	}
	return nil
}

// removeFiles removes output files that nothing has any more. A young one may
// belong to a record that another process is about to commit; the lock that the
// caller holds keeps that process from committing before it sees the file gone.
func (s *Store) removeFiles(in *inventory) error {
	return filepath.WalkDir(s.outputDir(), func(path string, entry fs.DirEntry, err error) error {
		if errors.Is(err, fs.ErrNotExist) || err == nil && entry.IsDir() {
			return nil
		}
		if err != nil {
			return err
		}
		if strings.HasPrefix(entry.Name(), unfinished) {
			if info, err := entry.Info(); err != nil || s.o.Now().Sub(info.ModTime()) < stale {
				return nil
			}
		} else if in.has(entry.Name()) {
			return nil
		}
		if err := os.Remove(path); err != nil && !errors.Is(err, fs.ErrNotExist) {
			return err
		}
		return nil
	})
}

// removeLeftovers removes damaged databases that were set aside, and what was
// not finished when a process was killed.
func (s *Store) removeLeftovers() error {
	os.Remove(s.database() + damagedSuffix)
	unfinished, err := filepath.Glob(s.database() + freshSuffix + "*")
	if err != nil {
		return err
	}
	for _, path := range unfinished {
		if info, err := os.Stat(path); err == nil && s.o.Now().Sub(info.ModTime()) > stale {
			os.Remove(path)
		}
	}
	return nil
}

// has says whether an output file's name is a digest that something has.
func (in *inventory) has(name string) bool {
	d, err := hex.DecodeString(name)
	return err == nil && len(d) == len(Digest{}) && in.outputs[Digest(d)] != nil
}
