package cache

import (
	"bytes"
	"fmt"
	"os"
	"path/filepath"
	"testing"

	bolt "go.etcd.io/bbolt"
	"pgregory.net/rapid"
)

// Whatever is put into a database and deleted from it, the check passes it, and
// its own reading finds the entries that bbolt finds.
func TestPagesOfSoundDatabases(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		dir, err := os.MkdirTemp("", "steelyard-test")
		if err != nil {
			t.Fatal(err)
		}
		defer os.RemoveAll(dir)
		s := &Store{dir: dir}
		for range rapid.IntRange(1, 5).Draw(t, "transactions") {
			db, err := bolt.Open(s.database(), 0o666, &bolt.Options{PageSize: 1024, NoSync: true})
			if err != nil {
				t.Fatal(err)
			}
			want := 0
			err = db.Update(func(tx *bolt.Tx) error {
				if err := s.prepare(tx); err != nil {
					return err
				}
				for range rapid.IntRange(1, 5).Draw(t, "ranges") {
					from, count := rapid.IntRange(0, 300).Draw(t, "from"), rapid.IntRange(1, 200).Draw(t, "count")
					size := rapid.SampledFrom([]int{0, 10, 100, 3000}).Draw(t, "size")
					remove := rapid.Bool().Draw(t, "remove")
					for i := from; i < from+count; i++ {
						bucket := buckets[1+i%3]
						key := fmt.Appendf(nil, "key %04d", i*7919%503)
						if remove {
							if err := tx.Bucket(bucket).Delete(key); err != nil {
								return err
							}
						} else if err := put(tx, bucket, key, bytes.Repeat([]byte{byte(i)}, size)); err != nil {
							return err
						}
					}
				}
				for _, name := range buckets {
					tx.Bucket(name).ForEach(func(k, v []byte) error { want++; return nil })
				}
				return nil
			})
			if err != nil {
				t.Fatal(err)
			}
			db.Close()
			data, err := os.ReadFile(s.database())
			if err != nil {
				t.Fatal(err)
			}
			pages, err := newPageFile(data)
			if err == nil {
				err = pages.check()
			}
			if err != nil {
				t.Fatal(err)
			}
			got := 0
			pages.entries(true, func(key, sealed []byte) error { got++; return nil })
			if got != want || !intact(data) {
				t.Fatalf("%d entries, bbolt finds %d", got, want)
			}
		}
	})
}

// Whatever the bytes, reading them ends, and without a panic.
func FuzzPages(f *testing.F) {
	path := filepath.Join(f.TempDir(), "store.db")
	db, err := bolt.Open(path, 0o666, &bolt.Options{PageSize: 512}) // small, so that much can go wrong with few bytes
	if err != nil {
		f.Fatal(err)
	}
	for range 3 {
		err := db.Update(func(tx *bolt.Tx) error {
			b, err := tx.CreateBucketIfNotExists(outputBucket)
			for i := 0; i < 20 && err == nil; i++ {
				err = put(tx, outputBucket, fmt.Append(nil, i), bytes.Repeat([]byte{'x'}, 10+i*40))
			}
			if err == nil {
				_, err = tx.CreateBucketIfNotExists(nameBucket)
			}
			if err == nil {
				err = put(tx, nameBucket, []byte("name"), []byte("value"))
			}
			if err == nil {
				err = b.Delete([]byte("7"))
			}
			return err
		})
		if err != nil {
			f.Fatal(err)
		}
	}
	db.Close()
	data, err := os.ReadFile(path)
	if err != nil || !intact(data) {
		f.Fatal("the seed is damaged", err)
	}
	f.Add(data)
	f.Add(data[:3000])
	f.Add([]byte{})
	f.Fuzz(func(t *testing.T, data []byte) {
		pages, err := newPageFile(data)
		if err == nil {
			pages.check()
		}
		for _, live := range []bool{true, false} {
			pages.entries(live, func(key, value []byte) error { return nil })
		}
	})
}
