package cache

import (
	"bytes"
	"context"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"
)

// digest reads one file through the store.
func digestFile(t testing.TB, s *Store, path string) (*FileState, error) {
	t.Helper()
	states, errs := s.FileDigests(t.Context(), []string{path}, 2)
	if errs[0] == nil && states[0].Path != path {
		t.Errorf("state of %s", states[0].Path)
	}
	return states[0], errs[0]
}

func write(t testing.TB, path string, content []byte, age time.Duration) {
	t.Helper()
	if err := os.WriteFile(path, content, 0o666); err != nil {
		t.Fatal(err)
	}
	then := time.Now().Add(-age)
	if err := os.Chtimes(path, then, then); err != nil {
		t.Fatal(err)
	}
}

func TestFileDigests(t *testing.T) {
	dir := t.TempDir()
	s := open(t, filepath.Join(dir, "store"), Options{})
	var paths []string
	for i, size := range []int{0, 1, 100, 5000, largeFile - 1, largeFile, 3*largeFile + 5} {
		path := filepath.Join(dir, string(rune('a'+i)))
		content := bytes.Repeat([]byte{byte(i)}, size)
		write(t, path, content, time.Hour)
		f, err := digestFile(t, s, path)
		if err != nil || f.Digest != DigestOf(content) {
			t.Errorf("%d bytes: %v, %v", size, f, err)
		}
		paths = append(paths, path)
	}
	states, errs := s.FileDigests(t.Context(), append(paths, filepath.Join(dir, "none")), 3)
	for i := range paths {
		if errs[i] != nil || states[i].Path != paths[i] {
			t.Errorf("%s: %v, %v", paths[i], states[i], errs[i])
		}
	}
	if errs[len(paths)] == nil || states[len(paths)] != nil {
		t.Error("a missing file had a state")
	}
}

// A large file that is old and unchanged is not read again: when its content is
// replaced behind the file system's back (here: by a store that is told another
// digest), the remembered digest is what comes.
func TestUnchangedLargeFileIsNotReadAgain(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "large")
	later := func() time.Time { return time.Now().Add(time.Hour) } // its change is then an hour old
	s := open(t, filepath.Join(dir, "store"), Options{Now: later})
	write(t, path, make([]byte, largeFile), 0)
	f, err := digestFile(t, s, path)
	if err != nil {
		t.Fatal(err)
	}
	f.Digest = DigestOf([]byte("told"))
	s.memorise([]*FileState{f})
	if again, err := digestFile(t, s, path); err != nil || again.Digest != f.Digest {
		t.Errorf("the file was read again: %v, %v", again, err)
	}
	// Whatever the file system shows of a change makes it read the file.
	for name, change := range map[string]func(){
		"touched":   func() { now := time.Now(); os.Chtimes(path, now, now) },
		"rewritten": func() { os.WriteFile(path, make([]byte, largeFile), 0o666) },
		"replaced": func() {
			info, _ := os.Stat(path)
			os.WriteFile(path+"2", make([]byte, largeFile), 0o666)
			os.Chtimes(path+"2", info.ModTime(), info.ModTime())
			os.Rename(path+"2", path)
		},
	} {
		s.memorise([]*FileState{f})
		time.Sleep(20 * time.Millisecond) // coarser than the clock of file systems
		change()
		if again, err := digestFile(t, s, path); err != nil || again.Digest != DigestOf(make([]byte, largeFile)) {
			t.Errorf("%s: not read again: %v, %v", name, again, err)
		}
		f, _ = digestFile(t, s, path)
		f.Digest = DigestOf([]byte("told"))
	}
}

// A file that was just written is not remembered, for a second change could
// bear the same time.
func TestYoungFileIsNotRemembered(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "large")
	s := open(t, filepath.Join(dir, "store"), Options{})
	write(t, path, make([]byte, largeFile), time.Hour) // its inode is young all the same
	if _, err := digestFile(t, s, path); err != nil {
		t.Fatal(err)
	}
	if _, err := os.Stat(s.database()); err == nil {
		t.Error("something was stored")
	}
}

func TestFilesThatAreNone(t *testing.T) {
	dir := t.TempDir()
	s := open(t, filepath.Join(dir, "store"), Options{})
	pipe := filepath.Join(dir, "pipe")
	if err := syscall.Mkfifo(pipe, 0o666); err != nil {
		t.Fatal(err)
	}
	for path, part := range map[string]string{
		dir: "is not an ordinary file", pipe: "is not an ordinary file", "/dev/zero": "is not an ordinary file", dir + "/none": "no such file",
	} {
		if _, err := digestFile(t, s, path); err == nil || !strings.Contains(err.Error(), part) || !strings.Contains(err.Error(), path) {
			t.Errorf("%s: %v", path, err)
		}
	}
}

func TestFileAgain(t *testing.T) {
	path := filepath.Join(t.TempDir(), "data")
	for _, age := range []time.Duration{0, time.Hour} {
		write(t, path, []byte("first"), 0)
		now := func() time.Time { return time.Now().Add(age) }
		f, err := readFile(t.Context(), path, now)
		if err != nil {
			t.Fatal(err)
		}
		if again, err := f.Again(t.Context()); err != nil || !again.Same(f) {
			t.Errorf("unchanged: %v", err)
		}
		time.Sleep(20 * time.Millisecond) // coarser than the clock of file systems
		write(t, path, []byte("first"), 0)
		if again, err := f.Again(t.Context()); err != nil || again.Same(f) {
			t.Errorf("touched: %v, %v", again, err)
		}
		os.WriteFile(path, []byte("other"), 0o666) // of the same length
		if _, err := f.Again(t.Context()); err == nil || !strings.Contains(err.Error(), "has changed since this run began") {
			t.Errorf("edited: %v", err)
		}
		os.Remove(path)
		if _, err := f.Again(t.Context()); err == nil {
			t.Error("removed, and not noticed")
		}
	}
}

func TestHashingStops(t *testing.T) {
	path := filepath.Join(t.TempDir(), "data")
	write(t, path, []byte("content"), 0)
	ctx, cancel := context.WithCancel(t.Context())
	cancel()
	if _, err := readFile(ctx, path, time.Now); err != context.Canceled {
		t.Error(err)
	}
}

// Hashing should cost what SHA-256 costs.
func BenchmarkHashFile(b *testing.B) {
	path := filepath.Join(b.TempDir(), "data")
	write(b, path, make([]byte, 64<<20), 0)
	b.SetBytes(64 << 20)
	for b.Loop() {
		if _, err := readFile(b.Context(), path, time.Now); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkHashMemory(b *testing.B) {
	content := make([]byte, 64<<20)
	b.SetBytes(64 << 20)
	for b.Loop() {
		DigestOf(content)
	}
}

func BenchmarkRecallLargeFile(b *testing.B) {
	dir := b.TempDir()
	path := filepath.Join(dir, "data")
	s := open(b, filepath.Join(dir, "store"), Options{Now: func() time.Time { return time.Now().Add(time.Hour) }})
	write(b, path, make([]byte, 64<<20), 0)
	digestFile(b, s, path)
	for b.Loop() {
		digestFile(b, s, path)
	}
}
