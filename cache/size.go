package cache

import (
	"encoding/binary"
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"time"
)

// Usage is what a store holds.
type Usage struct {
	Bytes     int64 // the whole folder
	Database  int64 // the database alone
	Records   int
	Weighings int
	Recipes   []RecipeUsage // in the order of their names
}

// RecipeUsage is what a store holds for one recipe. What recipes share counts
// for each of them.
type RecipeUsage struct {
	Recipe    string
	Nodes     int   // whose last output is there
	Bytes     int64 // of those outputs
	Weighings int
	Used      time.Time // when last weighed
}

// Size adds up what is in the store and for whom.
func (s *Store) Size() (*Usage, error) {
	u := &Usage{}
	type held struct {
		bytes int64
		used  time.Time
	}
	records := map[Key]*held{}
	err := s.tolerate(s.scan(recordBucket, func(key, value []byte, damage error) error {
		if r, err := DecodeRecord(value); damage == nil && err == nil {
			records[Key(key)] = &held{bytes: r.Size, used: r.Finished}
		}
		return nil
	}))
	if err != nil {
		return nil, err
	}
	u.Records = len(records)
	err = s.tolerate(s.scan(usedBucket, func(key, value []byte, damage error) error {
		if damage != nil || len(value) != 8 {
			return nil
		}
		if r := records[Key(key)]; r != nil {
			r.used = time.Unix(int64(binary.BigEndian.Uint64(value)), 0).UTC()
		}
		return nil
	}))
	if err != nil {
		return nil, err
	}
	recipes := map[string]*RecipeUsage{}
	of := func(recipe string) *RecipeUsage {
		if recipes[recipe] == nil {
			recipes[recipe] = &RecipeUsage{Recipe: recipe}
		}
		return recipes[recipe]
	}
	err = s.tolerate(s.scan(nameBucket, func(key, value []byte, damage error) error {
		name, err := nameOf(key)
		if err != nil || damage != nil || len(value) != 2*len(Key{}) {
			return nil
		}
		if r := records[Key(value[:len(Key{})])]; r != nil {
			recipe := of(name.Recipe)
			recipe.Nodes++
			recipe.Bytes += r.bytes
			if r.used.After(recipe.Used) {
				recipe.Used = r.used
			}
		}
		return nil
	}))
	if err != nil {
		return nil, err
	}
	history, err := s.History("")
	if err != nil {
		return nil, err
	}
	u.Weighings = len(history)
	for _, w := range history {
		recipe := of(w.Recipe)
		recipe.Weighings++
		if w.Finished.After(recipe.Used) {
			recipe.Used = w.Finished
		}
	}
	for _, r := range recipes {
		u.Recipes = append(u.Recipes, *r)
	}
	slices.SortFunc(u.Recipes, func(a, b RecipeUsage) int { return strings.Compare(a.Recipe, b.Recipe) })
	if info, err := os.Stat(s.database()); err == nil {
		u.Database = info.Size()
	}
	u.Bytes, err = s.bytes()
	return u, err
}

// bytes is the size of the files in the store's folder.
func (s *Store) bytes() (total int64, err error) {
	err = filepath.WalkDir(s.dir, func(_ string, entry fs.DirEntry, err error) error {
		if err == nil && entry.Type().IsRegular() {
			var info fs.FileInfo
			if info, err = entry.Info(); err == nil {
				total += info.Size()
			}
		}
		if errors.Is(err, fs.ErrNotExist) { // removed while we looked
			return nil
		}
		return err
	})
	return total, err
}
