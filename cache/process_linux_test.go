package cache

import (
	"bytes"
	"context"
	"fmt"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"
	"testing"
	"time"
)

// The test binary runs itself in other processes: childVar says as what, and
// the arguments follow the flags.
const childVar = "STEELYARD_CACHE_TEST_CHILD"

var children = map[string]func(args []string) error{
	"fill": childFill, "full": childFull, "read-only mount": childReadOnlyMount, "read-only folder": childReadOnlyFolder,
}

func TestMain(m *testing.M) {
	if name := os.Getenv(childVar); name != "" {
		if err := children[name](os.Args[1:]); err != nil {
			fmt.Println(err)
			os.Exit(1)
		}
		os.Exit(0)
	}
	os.Exit(m.Run())
}

func child(name string, args ...string) *exec.Cmd {
	c := exec.Command(os.Args[0], args...)
	c.Env = append(os.Environ(), childVar+"="+name)
	return c
}

// childFill puts entries for ever, from a number on, says each on standard
// output when it is stored, and trims now and then.
func childFill(args []string) error {
	from, _ := strconv.Atoi(args[1])
	s, err := Open(args[0], Options{})
	if err != nil {
		return err
	}
	for i := from; i < from+1000; i++ {
		s.Put(entry(i))
		fmt.Println(i)
		if i%20 == 19 {
			if _, err := s.Trim(Trim{Recipes: []string{"none"}}); err != nil {
				return err
			}
		}
	}
	return nil
}

// A process that is killed at any instant, even while it rewrites the database,
// leaves a store in which everything it had finished is whole.
func TestKilledWhileStoring(t *testing.T) {
	dir := t.TempDir()
	r := rand.New(rand.NewPCG(7, 8))
	kills := rounds(40, 600)
	next := 0
	for range kills {
		c := child("fill", dir, fmt.Sprint(next))
		var out bytes.Buffer
		c.Stdout, c.Stderr = &out, &out
		if err := c.Start(); err != nil {
			t.Fatal(err)
		}
		time.Sleep(time.Duration(10+r.IntN(90)) * time.Millisecond)
		c.Process.Kill()
		c.Wait()
		lines := strings.Split(out.String(), "\n")
		lines = lines[:len(lines)-1] // a last line may be cut
		s, err := Open(dir, Options{})
		if err != nil {
			t.Fatal(err)
		}
		for _, line := range lines {
			i, err := strconv.Atoi(line)
			if err != nil {
				t.Fatal(out.String())
			}
			next = i + 1
		}
		if lost := lostOf(s, next); len(lost) > 0 {
			t.Fatalf("lost: %v", lost)
		}
		wantSilence(t, s)
		s.Close()
	}
	if next < kills {
		t.Logf("only %d entries in %d processes", next, kills)
	}
	s := open(t, dir, Options{})
	c, err := s.Check(t.Context(), false)
	if err != nil || len(c.Problems) > 0 || c.Records < next {
		t.Errorf("%+v, %v", c, err)
	}
}

// Several processes at once, one of them killed.
func TestManyProcesses(t *testing.T) {
	dir := t.TempDir()
	var all []*exec.Cmd
	var outs []*bytes.Buffer
	for i := range 3 {
		c := child("fill", dir, fmt.Sprint(10*i)) // with most entries in common
		out := &bytes.Buffer{}
		c.Stdout, c.Stderr = out, out
		if err := c.Start(); err != nil {
			t.Fatal(err)
		}
		all, outs = append(all, c), append(outs, out)
	}
	time.Sleep(700 * time.Millisecond)
	for _, c := range all {
		c.Process.Kill()
		c.Wait()
	}
	s := open(t, dir, Options{})
	for p, out := range outs {
		lines := strings.Split(out.String(), "\n")
		for _, line := range lines[:len(lines)-1] {
			i, err := strconv.Atoi(line)
			if err != nil {
				t.Fatalf("process %d: %s", p, out)
			}
			wantEntries(t, s, i, i+1)
		}
	}
	wantSilence(t, s)
}

// inNamespace runs a child where it may mount file systems.
func inNamespace(t *testing.T, name string, args ...string) {
	t.Helper()
	c := child(name, args...)
	c.SysProcAttr = &syscall.SysProcAttr{
		Cloneflags:  syscall.CLONE_NEWUSER | syscall.CLONE_NEWNS,
		UidMappings: []syscall.SysProcIDMap{{ContainerID: 0, HostID: os.Getuid(), Size: 1}},
		GidMappings: []syscall.SysProcIDMap{{ContainerID: 0, HostID: os.Getgid(), Size: 1}},
	}
	out, err := c.CombinedOutput()
	if err != nil && (c.ProcessState == nil || strings.Contains(string(out), "cannot mount")) {
		t.Skipf("this system does not let a test mount a file system: %v %s", err, out)
	}
	if err != nil {
		t.Fatalf("%v: %s", err, out)
	}
}

func TestFullDisk(t *testing.T) { inNamespace(t, "full", t.TempDir()) }

// childFull fills a file system of 2 MB.
func childFull(args []string) error {
	if err := syscall.Mount("tmpfs", args[0], "tmpfs", 0, "size=2m"); err != nil {
		return fmt.Errorf("cannot mount: %w", err)
	}
	dir := filepath.Join(args[0], "store")
	s, err := Open(dir, Options{})
	if err != nil {
		return err
	}
	for i := range 400 { // 57 outputs of 72 kB do not fit
		s.Put(entry(i))
	}
	w := s.Warnings()
	if len(w) != 1 || !strings.Contains(w[0], "no space left to store results in "+dir) {
		return fmt.Errorf("warnings %q", w)
	}
	if lost := lostOf(s, 400); len(lost) > 0 {
		return fmt.Errorf("lost while open: %v", lost)
	}
	if _, err := s.Remember(Weighing{Recipe: "r"}, []byte("body")); err == nil || !strings.Contains(err.Error(), "not recorded") {
		return fmt.Errorf("remembering gave %v", err)
	}
	s.Close()
	again, err := Open(dir, Options{})
	if err != nil {
		return err
	}
	defer again.Close()
	kept := 400 - len(lostOf(again, 400))
	if kept < 100 || kept == 400 {
		return fmt.Errorf("%d entries were kept", kept)
	}
	c, err := again.Check(context.Background(), false)
	if err != nil || len(c.Problems) > 0 {
		return fmt.Errorf("check: %+v, %v", c, err)
	}
	// Making room helps.
	if _, err := again.Trim(Trim{Before: time.Now().Add(time.Hour)}); err != nil {
		return fmt.Errorf("trimming a full disk: %w", err)
	}
	again.Put(entry(399))
	if w := again.Warnings(); len(w) > 0 {
		return fmt.Errorf("after making room: %q", w)
	}
	return nil
}

func TestReadOnlyMount(t *testing.T) { inNamespace(t, "read-only mount", filled(t, 20)) }

func childReadOnlyMount(args []string) error {
	if err := syscall.Mount(args[0], args[0], "", syscall.MS_BIND, ""); err != nil {
		return fmt.Errorf("cannot mount: %w", err)
	}
	if err := syscall.Mount("", args[0], "", syscall.MS_BIND|syscall.MS_REMOUNT|syscall.MS_RDONLY, ""); err != nil {
		return fmt.Errorf("cannot mount: %w", err)
	}
	return childReadOnly(args[0], 20)
}

func TestReadOnlyFolder(t *testing.T) {
	dir := filled(t, 20)
	empty := t.TempDir()
	for d := dir; d != filepath.Dir(os.TempDir()) && d != "/"; d = filepath.Dir(d) {
		if d != os.TempDir() {
			os.Chmod(d, 0o755) // let another user in
		}
	}
	os.Chmod(empty, 0o555)
	filepath.Walk(dir, func(path string, info os.FileInfo, err error) error {
		return os.Chmod(path, info.Mode()&0o555)
	})
	t.Cleanup(func() {
		filepath.Walk(dir, func(path string, info os.FileInfo, err error) error { return os.Chmod(path, info.Mode()|0o755) })
		os.Chmod(empty, 0o755)
	})
	c := child("read-only folder", dir, empty)
	if os.Getuid() == 0 { // whom permissions do not stop
		c.SysProcAttr = &syscall.SysProcAttr{Credential: &syscall.Credential{Uid: 65534, Gid: 65534}}
	}
	out, err := c.CombinedOutput()
	if err != nil && c.ProcessState == nil {
		t.Skipf("cannot run as another user: %v", err)
	}
	if err != nil {
		t.Fatalf("%v: %s", err, out)
	}
}

func childReadOnlyFolder(args []string) error {
	if err := childReadOnly(args[0], 20); err != nil {
		return err
	}
	return childReadOnly(filepath.Join(args[1], "store"), 0)
}

// childReadOnly uses a store with n entries that cannot be written to.
func childReadOnly(dir string, n int) error {
	s, err := Open(dir, Options{})
	if err != nil {
		return err
	}
	if lost := lostOf(s, n); len(lost) > 0 {
		return fmt.Errorf("cannot read: %v", lost)
	}
	if w := s.Warnings(); len(w) > 0 {
		return fmt.Errorf("reading warns: %q", w)
	}
	for i := n; i < n+10; i++ {
		s.Put(entry(i))
	}
	if lost := lostOf(s, n+10); len(lost) > 0 {
		return fmt.Errorf("lost: %v", lost)
	}
	if w := s.Warnings(); len(w) != 1 || !strings.Contains(w[0], "the store in "+dir+" cannot be written") {
		return fmt.Errorf("warnings: %q", w)
	}
	if c, err := s.Check(context.Background(), true); err != nil || len(c.Problems) > 0 || c.Records != n {
		return fmt.Errorf("check: %+v, %v", c, err)
	}
	return s.Close()
}
