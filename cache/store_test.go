package cache

import (
	"bytes"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"
)

func open(t testing.TB, dir string, o Options) *Store {
	t.Helper()
	s, err := Open(dir, o)
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { s.Close() })
	return s
}

// entry is the i-th record of a made-up run, and its output; every seventh is
// large.
func entry(i int) (*Record, []byte) {
	output := fmt.Appendf(nil, "output %d", i)
	if i%7 == 3 {
		output = bytes.Repeat(output, 8000)
	}
	return &Record{
		Name:       Name{"recipe", fmt.Sprint("node", i)},
		Kind:       "test/kind",
		Transcript: fmt.Sprintf("steelyard key 1\nnumber %d\n", i),
		Seconds:    float64(i),
		Finished:   time.Unix(int64(i), 0).UTC(),
	}, output
}

func fill(s *Store, from, to int) {
	var wg sync.WaitGroup
	for i := from; i < to; i++ {
		wg.Go(func() { s.Put(entry(i)) })
	}
	wg.Wait()
}

// find looks up the i-th entry: its output, or why there is none.
func find(s *Store, i int) (output []byte, reason string) {
	r, want := entry(i)
	var found *Record
	s.View(func(reader *Reader) error {
		found, reason = reader.Record(r.Key())
		return nil
	})
	if found == nil {
		return nil, "no record: " + reason
	}
	output, err := s.Output(found.Output)
	if err != nil {
		return nil, err.Error()
	}
	if !bytes.Equal(output, want) || found.Transcript != r.Transcript {
		panic(fmt.Sprintf("wrong bytes for entry %d", i))
	}
	return output, ""
}

func wantEntries(t testing.TB, s *Store, from, to int) {
	t.Helper()
	for i := from; i < to; i++ {
		if _, reason := find(s, i); reason != "" {
			t.Fatalf("entry %d: %s", i, reason)
		}
	}
}

func wantSilence(t testing.TB, s *Store) {
	t.Helper()
	if w := s.Warnings(); len(w) > 0 {
		t.Fatalf("warnings: %q", w)
	}
}

func wantWarning(t testing.TB, s *Store, part string) {
	t.Helper()
	if w := s.Warnings(); len(w) != 1 || !strings.Contains(w[0], part) {
		t.Fatalf("warnings %q, want one with %q", w, part)
	}
}

func TestWhatWasPutIsThere(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "new", "store")
	s := open(t, dir, Options{})
	fill(s, 0, 50)
	wantEntries(t, s, 0, 50)
	s.Close()
	again := open(t, dir, Options{})
	wantEntries(t, again, 0, 50)
	if _, reason := find(again, 50); reason != "no record: " {
		t.Errorf("an unknown key gave %q", reason)
	}
	if _, err := again.Output(DigestOf([]byte("other"))); !errors.Is(err, ErrMissing) {
		t.Errorf("an unknown output gave %v", err)
	}
	wantSilence(t, s)
	wantSilence(t, again)
}

// Looking into a store that is not there must not make one.
func TestLookingLeavesNoTrace(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "store")
	s := open(t, dir, Options{})
	find(s, 0)
	s.History("")
	s.Size()
	s.Check(t.Context(), false)
	s.Close()
	if _, err := os.Stat(dir); !errors.Is(err, os.ErrNotExist) {
		t.Errorf("the folder was made: %v", err)
	}
	wantSilence(t, s)
}

func TestNamesRememberTheLastTwoKeys(t *testing.T) {
	now := time.Unix(1e9, 0)
	s := open(t, t.TempDir(), Options{Now: func() time.Time { return now }})
	name := Name{"recipe", "node"}
	put := func(i int) Use {
		r, output := entry(i)
		r.Name = name
		s.Put(r, output)
		return Use{name, r.Key()}
	}
	past := func() string {
		var text string
		s.View(func(r *Reader) error {
			last, before := r.Past(name)
			for _, record := range []*Record{last, before} {
				if record != nil {
					text += strings.Fields(record.Transcript)[4] + " "
				}
			}
			return nil
		})
		return text
	}
	noted := func(u Use) (yes bool) {
		s.View(func(r *Reader) error { yes = r.Noted(u); return nil })
		return yes
	}
	if got := past(); got != "" {
		t.Errorf("past %q of nothing", got)
	}
	one, two := put(1), put(2)
	if got := past(); got != "2 1 " {
		t.Errorf("past %q", got)
	}
	if noted(one) || !noted(two) {
		t.Error("the name should stand for the second")
	}
	s.Touch([]Use{one})
	if got := past(); got != "1 2 " || !noted(one) {
		t.Errorf("past %q after going back", got)
	}
	s.Touch([]Use{one})
	if got := past(); got != "1 2 " {
		t.Errorf("past %q after no change", got)
	}
	now = now.Add(usedAgain)
	if noted(one) {
		t.Error("an old use should be noted again")
	}
	s.View(func(r *Reader) error {
		if got := r.Seconds("test/kind"); got != 2 {
			t.Errorf("the kind took %v s", got)
		}
		return nil
	})
}

// Names and recipes with odd characters must not run into one another.
func TestNamesAreUnambiguous(t *testing.T) {
	s := open(t, t.TempDir(), Options{})
	names := []Name{{"a", "bc"}, {"ab", "c"}, {"", "abc"}, {"abc", ""}, {"a\x00", "b"}, {"a", "\x00b"}}
	for i, n := range names {
		r, output := entry(i)
		r.Name = n
		s.Put(r, output)
	}
	s.View(func(reader *Reader) error {
		for i, n := range names {
			want, _ := entry(i)
			if last, before := reader.Past(n); last == nil || last.Transcript != want.Transcript || before != nil {
				t.Errorf("%q: %v, %v", n, last, before)
			}
		}
		return nil
	})
}

func TestHistory(t *testing.T) {
	dir := t.TempDir()
	s := open(t, dir, Options{})
	large := bytes.Repeat([]byte("large body "), 10000)
	for i, w := range []struct {
		recipe string
		body   []byte
		number uint64
	}{{"b", []byte("1"), 1}, {"a", []byte("2"), 1}, {"b", large, 2}, {"b\xff", []byte("4"), 1}, {"b", []byte("1"), 3}} {
		number, err := s.Remember(Weighing{Recipe: w.recipe, Program: "v1", Finished: time.Unix(int64(i), 0).UTC()}, w.body)
		if err != nil || number != w.number {
			t.Fatalf("weighing %d got number %d, %v", i, number, err)
		}
	}
	s = open(t, dir, Options{})
	list, err := s.History("b")
	if err != nil || len(list) != 3 {
		t.Fatal(list, err)
	}
	for i, want := range []string{"1", string(large), "1"} {
		body, err := s.Output(list[i].Body)
		if err != nil || string(body) != want || list[i].Number != uint64(i+1) || list[i].Recipe != "b" || list[i].Program != "v1" {
			t.Errorf("%+v: %.20q, %v", list[i], body, err)
		}
	}
	if list[0].Body != list[2].Body || !list[2].Finished.Equal(time.Unix(4, 0)) {
		t.Errorf("%+v", list)
	}
	if all, err := s.History(""); err != nil || len(all) != 5 {
		t.Error(all, err)
	}
}

// Many goroutines and two stores on one folder, as two processes would have.
func TestManyAtOnce(t *testing.T) {
	dir := t.TempDir()
	a, b := open(t, dir, Options{}), open(t, dir, Options{})
	var wg sync.WaitGroup
	for i := range 40 {
		wg.Go(func() { a.Put(entry(i)) })
		wg.Go(func() { b.Put(entry(i + 20)) })
		wg.Go(func() { find(a, i) })
		wg.Go(func() { find(b, i) })
	}
	wg.Wait()
	wantEntries(t, a, 0, 60)
	wantEntries(t, b, 0, 60)
	wantSilence(t, a)
	wantSilence(t, b)
}

// A store that another process holds is waited for, not for ever, and then
// results are kept in memory.
func TestBusyStore(t *testing.T) {
	dir := t.TempDir()
	s := open(t, dir, Options{Wait: 100 * time.Millisecond})
	fill(s, 0, 5)
	holder := open(t, dir, Options{})
	db, err := holder.open(false)
	if err != nil {
		t.Fatal(err)
	}
	fill(s, 5, 6)
	wantWarning(t, s, "another process has held "+filepath.Join(dir, "store.db")+" for more than 100ms")
	if _, reason := find(s, 1); reason != "no record: " {
		t.Errorf("found in a store that is held: %q", reason)
	}
	wantWarning(t, s, "cannot be read: another process")
	wantEntries(t, s, 5, 6) // from memory
	db.Close()
	wantEntries(t, s, 0, 6)
	fill(s, 6, 7) // it goes on as if nothing had been
	wantEntries(t, open(t, dir, Options{}), 6, 7)
}

func TestClosedStore(t *testing.T) {
	s := open(t, t.TempDir(), Options{})
	fill(s, 0, 1)
	if err := s.Close(); err != nil {
		t.Fatal(err)
	}
	fill(s, 1, 2) // must not hang
	if err := s.Close(); err != nil {
		t.Fatal(err)
	}
}
