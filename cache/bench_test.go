package cache

import (
	"bytes"
	"os"
	"path/filepath"
	"testing"
	"time"

	bolt "go.etcd.io/bbolt"
)

// BenchmarkOpenLarge opens a store with a database of some 100 MB, whose pages
// are checked before anything else.
func BenchmarkOpenLarge(b *testing.B) {
	dir := b.TempDir()
	s := open(b, dir, Options{})
	for part := range 20 {
		s.commit(func(tx *bolt.Tx) error {
			for i := range 1000 {
				r, _ := entry(1000*part + i)
				output := bytes.Repeat([]byte{byte(i), byte(i >> 8), byte(part)}, 1500)
				r.Output, r.Size = DigestOf(output), int64(len(output))
				s.putRecord(tx, r, output)
				use(tx, Use{r.Name, r.Key()}, time.Now())
			}
			return nil
		})
	}
	info, err := os.Stat(filepath.Join(dir, "store.db"))
	if err != nil {
		b.Fatal(err)
	}
	for b.Loop() {
		again, err := Open(dir, Options{})
		if err != nil {
			b.Fatal(err)
		}
		again.Close()
	}
	b.ReportMetric(float64(info.Size())/1e6, "MB")
}

func BenchmarkPutSmall(b *testing.B) {
	s := open(b, b.TempDir(), Options{})
	for i := 0; b.Loop(); i++ {
		r, _ := entry(i)
		s.Put(r, []byte("output"))
	}
}

func BenchmarkPutLarge(b *testing.B) {
	s := open(b, b.TempDir(), Options{})
	output := make([]byte, 1<<20)
	b.SetBytes(1 << 20)
	for i := 0; b.Loop(); i++ {
		r, _ := entry(i)
		output[0] = byte(i)
		s.Put(r, output)
	}
}
