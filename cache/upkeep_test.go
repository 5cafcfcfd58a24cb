package cache

import (
	"bytes"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// clock is a clock that tests set.
type clock struct{ now time.Time }

func (c *clock) Now() time.Time { return c.now }

func TestSize(t *testing.T) {
	dir := t.TempDir()
	s := open(t, dir, Options{})
	fill(s, 0, 20)
	r, output := entry(3) // large, shared by a second recipe
	r.Name = Name{"another", "node"}
	s.Put(r, output)
	s.Remember(Weighing{Recipe: "another", Finished: time.Unix(5e9, 0)}, []byte("body"))
	u, err := s.Size()
	if err != nil {
		t.Fatal(err)
	}
	onDisk := int64(0)
	filepath.Walk(dir, func(_ string, info os.FileInfo, err error) error {
		if !info.IsDir() {
			onDisk += info.Size()
		}
		return err
	})
	if u.Bytes != onDisk || u.Records != 20 || u.Weighings != 1 || len(u.Recipes) != 2 || u.Database >= u.Bytes {
		t.Errorf("%+v; on disk %d", u, onDisk)
	}
	if a := u.Recipes[0]; a.Recipe != "another" || a.Nodes != 1 || a.Bytes != int64(len(output)) || a.Weighings != 1 || !a.Used.Equal(time.Unix(5e9, 0)) {
		t.Errorf("%+v", a)
	}
	if b := u.Recipes[1]; b.Recipe != "recipe" || b.Nodes != 20 || b.Weighings != 0 {
		t.Errorf("%+v", b)
	}
}

// records lists which of n entries the store has.
func present(s *Store, n int) (list []int) {
	lost := map[int]bool{}
	for _, i := range lostOf(s, n) {
		lost[i] = true
	}
	for i := range n {
		if !lost[i] {
			list = append(list, i)
		}
	}
	return list
}

func TestTrimByAge(t *testing.T) {
	dir := t.TempDir()
	c := &clock{time.Unix(1e9, 0)}
	s := open(t, dir, Options{Now: c.Now})
	fill(s, 0, 10)
	c.now = c.now.Add(time.Hour)
	fill(s, 10, 15)
	r, _ := entry(4)
	s.Touch([]Use{{r.Name, r.Key()}})
	before, _ := s.Size()
	trimmed, err := s.Trim(Trim{Before: c.now})
	if err != nil || trimmed.Records != 9 {
		t.Fatalf("%+v, %v", trimmed, err)
	}
	if got := fmt.Sprint(present(s, 15)); got != "[4 10 11 12 13 14]" {
		t.Errorf("left are %s", got)
	}
	after, _ := s.Size()
	if before.Bytes-after.Bytes != trimmed.Bytes || trimmed.Bytes <= 0 {
		t.Errorf("said %d, really %d", trimmed.Bytes, before.Bytes-after.Bytes)
	}
	wantSilence(t, s)
	s.Close()
	mend(t, dir, 15)
}

// What is removed comes off the disk: large outputs and pages of the database.
func TestTrimGivesSpaceBack(t *testing.T) {
	dir := t.TempDir()
	s := open(t, dir, Options{})
	for i := range 300 { // 60 kB each, in the database
		r, _ := entry(1000 + i)
		s.Put(r, bytes.Repeat([]byte{byte(i), byte(i >> 8)}, 30000))
	}
	fill(s, 0, 7)
	full, _ := s.Size()
	if full.Database < 18e6 {
		t.Fatalf("%+v", full)
	}
	trimmed, err := s.Trim(Trim{Before: time.Now().Add(time.Hour)})
	if err != nil || trimmed.Records != 307 {
		t.Fatalf("%+v, %v", trimmed, err)
	}
	empty, _ := s.Size()
	if empty.Bytes > 200e3 || empty.Records != 0 {
		t.Errorf("left: %+v", empty)
	}
	fill(s, 0, 7)
	wantEntries(t, s, 0, 7)
}

func TestTrimBySize(t *testing.T) {
	c := &clock{time.Unix(1e9, 0)}
	s := open(t, t.TempDir(), Options{Now: c.Now})
	for i := range 40 { // five from the tenth on are 72 kB
		fill(s, i, i+1)
		c.now = c.now.Add(time.Minute)
	}
	size := func() int64 { u, _ := s.Size(); return u.Bytes }
	for _, limit := range []int64{400e3, 300e3, 200e3} {
		trimmed, err := s.Trim(Trim{Bytes: limit})
		left := present(s, 40)
		if err != nil || trimmed.Records == 0 || size() > limit || len(left) == 0 {
			t.Fatalf("to %d: %+v, %v; %d bytes, left are %v", limit, trimmed, err, size(), left)
		}
		for i, e := range left { // the longest unused went, and no more than needed
			if e != 40-len(left)+i {
				t.Errorf("to %d: left are %v", limit, left)
			}
		}
		if size() < limit-110e3 {
			t.Errorf("to %d: only %d bytes are left", limit, size())
		}
		if trimmed, err = s.Trim(Trim{Bytes: limit}); err != nil || trimmed.Records != 0 {
			t.Errorf("trimmed again: %+v, %v", trimmed, err)
		}
	}
	if trimmed, err := s.Trim(Trim{Bytes: 1}); err != nil || len(present(s, 40)) != 0 || trimmed.Records == 0 {
		t.Errorf("to nothing: %+v, %v", trimmed, err)
	}
}

// An output stays as long as one record, or a weighing, has it; a record stays
// as long as one recipe uses it.
func TestTrimKeepsWhatIsShared(t *testing.T) {
	s := open(t, t.TempDir(), Options{})
	large := bytes.Repeat([]byte("shared "), 20000)
	put := func(recipe, node, transcript string, output []byte) {
		s.Put(&Record{Name: Name{recipe, node}, Transcript: transcript}, output)
	}
	put("a", "1", "one", large)
	put("b", "1", "two", large)
	put("a", "2", "three", []byte("small"))
	put("b", "2", "three", []byte("small"))
	put("a", "3", "four", []byte("of a alone"))
	put("a", "4", "five", []byte("a weighing's"))
	s.Remember(Weighing{Recipe: "a"}, []byte("a weighing's"))
	trimmed, err := s.Trim(Trim{Recipes: []string{"a"}})
	if err != nil || trimmed.Records != 3 {
		t.Fatalf("%+v, %v", trimmed, err)
	}
	for output, kept := range map[string]bool{string(large): true, "small": true, "of a alone": false, "a weighing's": true} {
		if _, err := s.Output(DigestOf([]byte(output))); (err == nil) != kept {
			t.Errorf("%.12q: %v", output, err)
		}
	}
	if u, _ := s.Size(); u.Weighings != 1 || u.Records != 2 {
		t.Errorf("%+v", u)
	}
	s.View(func(r *Reader) error {
		if last, _ := r.Past(Name{"b", "2"}); last == nil {
			t.Error("b lost its node")
		}
		if last, _ := r.Past(Name{"a", "2"}); last != nil {
			t.Error("a kept its node")
		}
		return nil
	})
	if c, err := s.Check(t.Context(), false); err != nil || len(c.Problems) > 0 {
		t.Errorf("%+v, %v", c, err)
	}
}

// What killed processes left behind goes when it is old.
func TestTrimSweeps(t *testing.T) {
	dir := filled(t, 7)
	s := open(t, dir, Options{})
	age := func(path string, d time.Duration) string {
		os.MkdirAll(filepath.Dir(path), 0o777)
		if err := os.WriteFile(path, []byte("left behind"), 0o666); err != nil {
			t.Fatal(err)
		}
		then := time.Now().Add(-d)
		os.Chtimes(path, then, then)
		return path
	}
	goes := []string{
		age(filepath.Join(dir, "outputs", unfinished+"1"), 2*stale),
		age(s.outputPath(DigestOf([]byte("orphan"))), 2*stale),
		age(filepath.Join(dir, "store.db.damaged"), 0),
		age(filepath.Join(dir, "store.db.new-1"), 2*stale),
	}
	stays := []string{
		age(filepath.Join(dir, "outputs", unfinished+"2"), 0),
		age(filepath.Join(dir, "store.db.new-2"), 0),
	}
	if _, err := s.Trim(Trim{}); err != nil {
		t.Fatal(err)
	}
	for _, path := range goes {
		if _, err := os.Stat(path); err == nil {
			t.Errorf("%s is still there", path)
		}
	}
	for _, path := range stays {
		if _, err := os.Stat(path); err != nil {
			t.Errorf("%s, which may still be written to, was removed", path)
		}
	}
	wantEntries(t, s, 0, 7)
}

func TestLimit(t *testing.T) {
	dir := t.TempDir()
	c := &clock{time.Unix(1e9, 0)}
	s := open(t, dir, Options{Limit: 400e3, Now: c.Now})
	for i := range 70 { // ten of 72 kB
		fill(s, i, i+1)
		c.now = c.now.Add(time.Minute)
	}
	if err := s.Close(); err != nil {
		t.Fatal(err)
	}
	u, err := open(t, dir, Options{}).Size()
	if err != nil || u.Bytes > 400e3 || u.Records < 10 {
		t.Errorf("%+v, %v", u, err)
	}
}

func TestAbsorb(t *testing.T) {
	a, b := t.TempDir(), filled(t, 40)
	from := open(t, b, Options{})
	from.Remember(Weighing{Recipe: "r", Finished: time.Unix(1, 0)}, []byte("one"))
	from.Remember(Weighing{Recipe: "r", Finished: time.Unix(2, 0)}, bytes.Repeat([]byte("two"), 40000))
	from.Close()
	flipIn(t, b, []byte("output 12"))
	s := open(t, a, Options{})
	fill(s, 0, 10)
	s.Remember(Weighing{Recipe: "r", Finished: time.Unix(1, 0)}, []byte("one"))
	got, err := s.Absorb(t.Context(), b)
	if err != nil || got.Records != 29 || got.Weighings != 1 || got.Skipped != 1 {
		t.Fatalf("%+v, %v", got, err)
	}
	wantEntries(t, s, 0, 12)
	wantEntries(t, s, 13, 40)
	if h, err := s.History("r"); err != nil || len(h) != 2 || h[1].Number != 2 || !h[1].Finished.Equal(time.Unix(2, 0)) {
		t.Errorf("%+v, %v", h, err)
	}
	s.View(func(r *Reader) error {
		want, _ := entry(30)
		if last, _ := r.Past(want.Name); last == nil || last.Transcript != want.Transcript {
			t.Error("the name of an absorbed node is unknown")
		}
		return nil
	})
	if got, err = s.Absorb(t.Context(), b); err != nil || got.Records != 0 || got.Weighings != 0 {
		t.Errorf("absorbed twice: %+v, %v", got, err)
	}
	if c, err := s.Check(t.Context(), false); err != nil || len(c.Problems) > 0 {
		t.Errorf("%+v, %v", c, err)
	}
	for dir, part := range map[string]string{a: "itself", t.TempDir(): "there is no store in"} {
		if _, err := s.Absorb(t.Context(), dir); err == nil || !strings.Contains(err.Error(), part) {
			t.Errorf("absorbing %s: %v", dir, err)
		}
	}
}

// A damaged store is looked after like any other, and said to be damaged.
func TestUpkeepOfDamagedStore(t *testing.T) {
	for name, change := range map[string]func([]byte) []byte{
		"text":   func([]byte) []byte { return []byte("not a database at all\n") },
		"pages":  func(b []byte) []byte { return append(b[:4*4096:4*4096], make([]byte, len(b)-4*4096)...) },
		"values": func(b []byte) []byte { return bytes.ReplaceAll(b, []byte("number 1"), []byte("number 7")) },
	} {
		t.Run(name, func(t *testing.T) {
			dir := filled(t, 30)
			spoil(t, dir, change)
			s := open(t, dir, Options{})
			if u, err := s.Size(); err != nil || u.Records >= 30 {
				t.Errorf("size: %+v, %v", u, err)
			}
			if _, err := s.History(""); err != nil {
				t.Errorf("history: %v", err)
			}
			if c, err := s.Check(t.Context(), false); err != nil || len(c.Problems) == 0 {
				t.Errorf("check: %+v, %v", c, err)
			}
			absorbing := open(t, t.TempDir(), Options{})
			if a, err := absorbing.Absorb(t.Context(), dir); err != nil || a.Records >= 30 || a.Skipped == 0 && len(absorbing.Warnings()) == 0 {
				t.Errorf("absorb: %+v, %v", a, err)
			}
			if _, err := s.Trim(Trim{Before: time.Unix(0, 0)}); err != nil {
				t.Errorf("trim: %v", err)
			}
			if w := strings.Join(s.Warnings(), "\n"); !strings.Contains(w, "was damaged") {
				t.Errorf("warnings %q", w)
			}
			s.Close()
			mend(t, dir, 30)
		})
	}
}

// Repairing removes records and weighings whose outputs are lost, so that the
// next check has nothing to say; what is whole stays.
func TestRepairRemovesWhatIsLost(t *testing.T) {
	dir := t.TempDir()
	s := open(t, dir, Options{})
	r, output := entry(0)
	s.Put(r, bytes.Repeat(output, 1+largeOutput/len(output)))
	s.Put(entry(1))
	for i := range 2 {
		if _, err := s.Remember(Weighing{Recipe: "r"}, bytes.Repeat([]byte{byte(i)}, largeOutput+1)); err != nil {
			t.Fatal(err)
		}
	}
	history, err := s.History("r")
	if err != nil {
		t.Fatal(err)
	}
	for _, lost := range []Digest{r.Output, history[0].Body} {
		if err := os.Remove(s.outputPath(lost)); err != nil {
			t.Fatal(err)
		}
	}
	for _, repair := range []bool{false, true} {
		if c, err := s.Check(t.Context(), repair); err != nil || len(c.Problems) != 2 {
			t.Fatalf("with repair %t: %+v, %v", repair, c, err)
		}
	}
	if c, err := s.Check(t.Context(), false); err != nil || len(c.Problems) != 0 || c.Records != 1 || c.Weighings != 1 {
		t.Errorf("afterwards: %+v, %v", c, err)
	}
	if left, err := s.History("r"); err != nil || len(left) != 1 || left[0].Number != 2 {
		t.Errorf("history: %+v, %v", left, err)
	}
}
