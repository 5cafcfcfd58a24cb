package cache

import (
	"bytes"
	"encoding/binary"
	"errors"
	"fmt"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"

	bolt "go.etcd.io/bbolt"
)

// filled gives the folder of a closed store with n entries.
func filled(t testing.TB, n int) string {
	t.Helper()
	dir := t.TempDir()
	s, err := Open(dir, Options{})
	if err != nil {
		t.Fatal(err)
	}
	fill(s, 0, n)
	s.Close()
	wantSilence(t, s)
	return dir
}

// spoil changes the database file of a closed store.
func spoil(t testing.TB, dir string, change func([]byte) []byte) {
	t.Helper()
	path := filepath.Join(dir, "store.db")
	b, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(path, change(b), 0o666); err != nil {
		t.Fatal(err)
	}
}

// flipIn changes one bit in every copy of some bytes.
func flipIn(t testing.TB, dir string, where []byte) {
	t.Helper()
	found := 0
	spoil(t, dir, func(b []byte) []byte {
		for from := 0; ; found++ {
			i := bytes.Index(b[from:], where)
			if i < 0 {
				break
			}
			b[from+i] ^= 1
			from += i + 1
		}
		return b
	})
	if found == 0 {
		t.Fatalf("%q is not in the database", where)
	}
}

// mend puts back what is missing of n entries and checks that the store is
// whole again.
func mend(t testing.TB, dir string, n int) {
	t.Helper()
	s := open(t, dir, Options{})
	lost := lostOf(s, n)
	var wg sync.WaitGroup
	for _, i := range lost {
		wg.Go(func() { s.Put(entry(i)) })
	}
	wg.Wait()
	wantEntries(t, s, 0, n)
	if _, err := s.Check(t.Context(), true); err != nil { // also what no entry needs
		t.Fatal(err)
	}
	s.Close()
	s = open(t, dir, Options{})
	if lost := lostOf(s, n); len(lost) > 0 {
		t.Fatalf("lost after mending: %v", lost)
	}
	if c, err := s.Check(t.Context(), false); err != nil || len(c.Problems) > 0 || c.Records != n {
		t.Fatalf("after mending: %d records, %q, %v", c.Records, c.Problems, err)
	}
	wantSilence(t, s)
}

// lostOf reads n entries, which must be right or missing, and gives the missing.
func lostOf(s *Store, n int) (lost []int) {
	found := map[int]Digest{}
	s.View(func(r *Reader) error {
		for i := range n {
			want, _ := entry(i)
			if record, _ := r.Record(want.Key()); record != nil {
				if record.Transcript != want.Transcript || record.Name != want.Name {
					panic(fmt.Sprintf("wrong record for entry %d", i))
				}
				found[i] = record.Output
			}
		}
		return nil
	})
	for i := range n {
		d, ok := found[i]
		output, err := s.Output(d)
		if !ok || err != nil {
			lost = append(lost, i)
			continue
		}
		if _, want := entry(i); !bytes.Equal(output, want) {
			panic(fmt.Sprintf("wrong bytes for entry %d", i))
		}
	}
	return lost
}

func TestDamagedSmallOutput(t *testing.T) {
	dir := filled(t, 30)
	flipIn(t, dir, []byte("output 12"))
	s := open(t, dir, Options{})
	_, reason := find(s, 12)
	if !strings.Contains(reason, "damaged") {
		t.Errorf("reason %q", reason)
	}
	c, err := s.Check(t.Context(), false)
	if err != nil || len(c.Problems) != 2 || !strings.Contains(c.Problems[0], "outputs") || !strings.Contains(c.Problems[1], "node12") {
		t.Errorf("check: %q, %v", c.Problems, err)
	}
	s.Put(entry(12))
	wantWarning(t, s, "was damaged")
	wantEntries(t, s, 0, 30)
	if _, err := os.Stat(filepath.Join(dir, "store.db.damaged")); err != nil {
		t.Errorf("the damaged file was not kept: %v", err)
	}
	mend(t, dir, 30)
}

func TestDamagedRecord(t *testing.T) {
	dir := filled(t, 30)
	flipIn(t, dir, []byte("number 12"))
	s := open(t, dir, Options{})
	if _, reason := find(s, 12); !strings.Contains(reason, "its record in the store is damaged") {
		t.Errorf("reason %q", reason)
	}
	wantEntries(t, s, 0, 12)
	wantEntries(t, s, 13, 30)
	s.Close()
	mend(t, dir, 30)
}

func TestDamagedKey(t *testing.T) {
	dir := filled(t, 30)
	r, _ := entry(12)
	key := r.Key()
	flipIn(t, dir, key[:])
	s := open(t, dir, Options{})
	if _, reason := find(s, 12); reason == "" {
		t.Error("found under a damaged key")
	}
	if c, _ := s.Check(t.Context(), true); len(c.Problems) == 0 {
		t.Error("the check saw nothing")
	}
	s.Close()
	mend(t, dir, 30)
}

func TestDamagedFile(t *testing.T) {
	for name, change := range map[string]func([]byte) []byte{
		"flipped":   func(b []byte) []byte { b[1000] ^= 4; return b },
		"truncated": func(b []byte) []byte { return b[:len(b)/2] },
		"empty":     func(b []byte) []byte { return nil },
		"longer":    func(b []byte) []byte { return append(b, 'x') },
	} {
		t.Run(name, func(t *testing.T) {
			dir := filled(t, 30)
			r, output := entry(10)
			path := (&Store{dir: dir}).outputPath(DigestOf(output))
			b, err := os.ReadFile(path)
			if err != nil {
				t.Fatal(err)
			}
			os.WriteFile(path, change(b), 0o666)
			s := open(t, dir, Options{})
			if _, err := s.Output(DigestOf(output)); !errors.As(err, new(*DamagedError)) {
				t.Errorf("read: %v", err)
			}
			c, err := s.Check(t.Context(), true)
			if err != nil || len(c.Problems) != 2 || !strings.Contains(c.Problems[0], path) || !strings.Contains(c.Problems[1], r.Name.Node) {
				t.Errorf("check: %q, %v", c.Problems, err)
			}
			s.Close()
			mend(t, dir, 30)
		})
	}
}

func TestMissingFile(t *testing.T) {
	dir := filled(t, 30)
	_, output := entry(10)
	os.Remove((&Store{dir: dir}).outputPath(DigestOf(output)))
	s := open(t, dir, Options{})
	if _, reason := find(s, 10); reason != "no record: its output is missing from the store" {
		t.Errorf("reason %q", reason)
	}
	s.Close()
	mend(t, dir, 30)
}

// Files that are no database, or half of one, count as a store that is lost;
// they are set aside, not deleted.
func TestSpoiltDatabase(t *testing.T) {
	for name, change := range map[string]func([]byte) []byte{
		"text":             func([]byte) []byte { return []byte("not a database at all\n") },
		"long text":        func([]byte) []byte { return bytes.Repeat([]byte("not a database at all\n"), 10000) },
		"empty":            func([]byte) []byte { return nil },
		"zeros":            func(b []byte) []byte { return make([]byte, len(b)) },
		"both metas":       func(b []byte) []byte { b[20] ^= 1; b[4096+20] ^= 1; return b },
		"one meta":         func(b []byte) []byte { b[20] ^= 1; return b },
		"cut to one page":  func(b []byte) []byte { return b[:4096] },
		"cut in a page":    func(b []byte) []byte { return b[:10000] },
		"cut in half":      func(b []byte) []byte { return b[:len(b)/2] },
		"last page zeroed": func(b []byte) []byte { clear(b[len(b)-4096:]); return b },
		"free list": func(b []byte) []byte {
			// The free list is the page whose header says 0x10.
			for p := 0; p+4096 <= len(b); p += 4096 {
				if binary.NativeEndian.Uint16(b[p+8:]) == 0x10 {
					for i := range 16 {
						b[p+8+i] ^= 0xa5
					}
				}
			}
			return b
		},
		"leaf pages": func(b []byte) []byte {
			for p := 5 * 4096; p+4096 <= len(b); p += 3 * 4096 {
				if binary.NativeEndian.Uint16(b[p+8:]) == 0x02 {
					for i := range 64 {
						b[p+8+i] ^= 0x5a
					}
				}
			}
			return b
		},
	} {
		t.Run(name, func(t *testing.T) {
			dir := filled(t, 60)
			spoil(t, dir, change)
			s := open(t, dir, Options{})
			lostOf(s, 60)
			fill(s, 60, 61)
			wantEntries(t, s, 60, 61)
			s.Close()
			s = open(t, dir, Options{})
			wantEntries(t, s, 60, 61)
			s.Close()
			mend(t, dir, 61)
		})
	}
}

// rounds is how often to repeat a random test: a quarter as often with -short,
// many times over where STEELYARD_SLOW is set.
func rounds(usual, slow int) int {
	switch {
	case os.Getenv("STEELYARD_SLOW") != "":
		return slow
	case testing.Short():
		return max(1, usual/4)
	}
	return usual
}

// Whatever bytes of the database are changed, nothing wrong is ever read, and
// the store can be mended.
func TestRandomDamage(t *testing.T) {
	dir := filled(t, 60)
	whole, err := os.ReadFile(filepath.Join(dir, "store.db"))
	if err != nil {
		t.Fatal(err)
	}
	r := rand.New(rand.NewPCG(3, 4))
	for range rounds(30, 3000) {
		spoil(t, dir, func([]byte) []byte {
			b := bytes.Clone(whole)
			for range 1 + r.IntN(20) {
				b[r.IntN(len(b))] = byte(r.Uint32())
			}
			return b
		})
		s, err := Open(dir, Options{})
		if errors.As(err, new(*newerError)) {
			t.Fatal("random bytes passed for a newer layout")
		}
		lostOf(s, 60)
		fill(s, 0, 5)
		wantEntries(t, s, 0, 5)
		if _, err := s.Check(t.Context(), true); err != nil {
			t.Fatal(err)
		}
		wantEntries(t, s, 0, 5)
		s.Close()
		s = open(t, dir, Options{}) // what was written into a damaged tree holds together
		wantEntries(t, s, 0, 5)
		wantSilence(t, s)
		s.Close()
	}
	mend(t, dir, 60)
}

// What describes the pages, their headers and elements, is where a changed byte
// leads astray.
func TestDamagedPageStructure(t *testing.T) {
	dir := filled(t, 60)
	whole, err := os.ReadFile(filepath.Join(dir, "store.db"))
	if err != nil {
		t.Fatal(err)
	}
	var places []int
	for p := 2 * 4096; p+4096 <= len(whole); p += 4096 {
		count := int(binary.NativeEndian.Uint16(whole[p+10:]))
		for i := range min(4096, 16+16*count+8*count) {
			places = append(places, p+i)
		}
	}
	r := rand.New(rand.NewPCG(5, 6))
	for range rounds(30, 3000) {
		spoil(t, dir, func([]byte) []byte {
			b := bytes.Clone(whole)
			for range 1 + r.IntN(3) {
				b[places[r.IntN(len(places))]] ^= 1 << r.IntN(8)
			}
			return b
		})
		s := open(t, dir, Options{})
		lostOf(s, 60)
		s.Close()
		mend(t, dir, 60)
	}
}

// A file cut short while it is mapped faults; the fault must not end the
// program.
func TestTruncatedWhileMapped(t *testing.T) {
	dir := filled(t, 60)
	s := open(t, dir, Options{})
	reasons := 0
	s.View(func(r *Reader) error {
		if err := os.Truncate(s.database(), 4096); err != nil {
			t.Fatal(err)
		}
		for i := range 60 {
			record, _ := entry(i)
			if found, reason := r.Record(record.Key()); found != nil {
				t.Errorf("entry %d found in a truncated file", i)
			} else if reason != "" {
				reasons++
			}
		}
		return nil
	})
	if reasons == 0 {
		t.Error("no reason was given")
	}
	s.Close()
	mend(t, dir, 60)
}

func TestNewerStore(t *testing.T) {
	dir := filled(t, 5)
	db, err := bolt.Open(filepath.Join(dir, "store.db"), 0o666, nil)
	if err != nil {
		t.Fatal(err)
	}
	db.Update(func(tx *bolt.Tx) error {
		return put(tx, metaBucket, schemaKey, binary.BigEndian.AppendUint64(nil, schema+1))
	})
	db.Close()
	before, _ := os.ReadFile(filepath.Join(dir, "store.db"))
	_, err = Open(dir, Options{})
	if err == nil || !strings.Contains(err.Error(), "written by a newer version of this program (layout 2, this one knows 1)") {
		t.Errorf("opening gave %v", err)
	}
	after, _ := os.ReadFile(filepath.Join(dir, "store.db"))
	if !bytes.Equal(before, after) {
		t.Error("a newer store was changed")
	}
}

// A panic in the caller's own function is a mistake there, not damage.
func TestOwnPanicIsNotDamage(t *testing.T) {
	s := open(t, filled(t, 3), Options{})
	defer func() {
		if p := recover(); p == nil || !strings.Contains(p.(string), "own mistake") {
			t.Errorf("recovered %v", p)
		}
		wantSilence(t, s)
	}()
	s.View(func(*Reader) error { panic("own mistake") })
}
