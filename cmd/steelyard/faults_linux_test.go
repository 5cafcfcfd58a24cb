package main

import (
	"crypto/sha256"
	"encoding/binary"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"

	bolt "go.etcd.io/bbolt"
)

// onDisk names, for a process of the test binary, a folder and what to make of
// it before the program runs: "read-only FOLDER" or "full FOLDER".
const onDisk = "STEELYARD_TEST_ON_DISK"

func init() {
	kind, dir, ok := strings.Cut(os.Getenv(onDisk), " ")
	if !ok {
		return
	}
	var err error
	switch kind {
	case "read-only":
		if err = syscall.Mount(dir, dir, "", syscall.MS_BIND, ""); err == nil {
			err = syscall.Mount("", dir, "", syscall.MS_BIND|syscall.MS_REMOUNT|syscall.MS_RDONLY, "")
		}
	case "full":
		err = syscall.Mount("tmpfs", dir, "tmpfs", 0, "size=100k")
	}
	if err != nil {
		fmt.Println("cannot mount:", err)
		os.Exit(1)
	}
}

// on runs the program where a folder is read-only or full, in a namespace of its
// own.
func on(t *testing.T, disk string, args ...string) (status int, stdout, stderr string) {
	t.Helper()
	c := exec.Command(os.Args[0], args...)
	c.Env = append(os.Environ(), asProgram+"=1", onDisk+"="+disk)
	c.SysProcAttr = &syscall.SysProcAttr{
		Cloneflags:  syscall.CLONE_NEWUSER | syscall.CLONE_NEWNS,
		UidMappings: []syscall.SysProcIDMap{{ContainerID: 0, HostID: os.Getuid(), Size: 1}},
		GidMappings: []syscall.SysProcIDMap{{ContainerID: 0, HostID: os.Getgid(), Size: 1}},
	}
	var out, log screen
	c.Stdout, c.Stderr = &out, &log
	err := c.Run()
	if c.ProcessState == nil || strings.Contains(out.String(), "cannot mount") {
		t.Skipf("this system does not let a test mount a file system: %v %s", err, &out)
	}
	return c.ProcessState.ExitCode(), out.String(), log.String()
}

// A store that cannot be written is read; what is new is computed and said not to
// be kept; and what is to change the store says that it cannot.
func TestReadOnlyStore(t *testing.T) {
	recipe, store := dunlin(t), t.TempDir()
	before, _ := succeed(t, "weigh", "--cache", store, recipe)
	disk := "read-only " + store
	if status, out, log := on(t, disk, "weigh", "--cache", store, recipe); status != exitDone || out != before || strings.Contains(log, "warning") || strings.Contains(log, "computed") {
		t.Errorf("unchanged: %d, %s", status, log)
	}
	for _, args := range [][]string{{"inspect", recipe}, {"trace", recipe, "lensing.shear.nfw"}, {"since", recipe, "--list"}, {"cache", "size"}, {"cache", "check"}} {
		if status, _, log := on(t, disk, append(args, "--cache", store)...); status != exitDone || log != "" {
			t.Errorf("%s: %d, %s", args[0], status, log)
		}
	}
	edit(t, recipe, "normal(0.0, 0.02)", "normal(0.0, 0.05)")
	after, _ := succeed(t, "weigh", "--cache", t.TempDir(), recipe)
	status, out, log := on(t, disk, "weigh", "--cache", store, recipe)
	if status != exitDone || out != after || !strings.Contains(log, "cannot be written") || !strings.Contains(log, "the weighing is not recorded") {
		t.Errorf("changed: %d, %s", status, log)
	}
	if n := strings.Count(log, "cannot be written"); n != 1 {
		t.Errorf("said %d times: %s", n, log)
	}
	if status, _, log := on(t, disk, "cache", "trim", "--down-to", "1kB", "--cache", store); status != exitFailed || !strings.Contains(log, "read-only") {
		t.Errorf("trim: %d, %s", status, log)
	}
	if status, _, log := on(t, disk, "cache", "absorb", "--cache", store, t.TempDir()); status != exitFailed {
		t.Errorf("absorb: %d, %s", status, log)
	}
}

// On a full disk the masses are printed all the same, and it is said once that
// they are not kept.
func TestFullDisk(t *testing.T) {
	recipe, disk := dunlin(t), t.TempDir()
	edit(t, recipe, "draws = 200", "draws = 900")
	want, _ := succeed(t, "weigh", "--cache", t.TempDir(), recipe)
	status, out, log := on(t, "full "+disk, "weigh", "--cache", filepath.Join(disk, "store"), recipe)
	if status != exitDone || out != want || strings.Count(log, "no space left to store results") != 1 {
		t.Errorf("%d, %s", status, log)
	}
}

// A store that a newer program wrote is left alone, by every command.
func TestNewerStore(t *testing.T) {
	recipe, store := dunlin(t), t.TempDir()
	weighed(t, "--cache", store, recipe)
	file := filepath.Join(store, "store.db")
	db, err := bolt.Open(file, 0o666, nil)
	if err != nil {
		t.Fatal(err)
	}
	err = db.Update(func(tx *bolt.Tx) error {
		// The layout's number, sealed as every value is: behind it the beginning of a
		// hash over bucket, key and value, the first two behind their lengths.
		bucket, key, value := "meta", "schema", binary.BigEndian.AppendUint64(nil, 99)
		h := sha256.New()
		for _, s := range []string{bucket, key} {
			h.Write(binary.BigEndian.AppendUint32(nil, uint32(len(s))))
			h.Write([]byte(s))
		}
		h.Write(value)
		return tx.Bucket([]byte(bucket)).Put([]byte(key), append(value, h.Sum(nil)[:16]...))
	})
	if err != nil {
		t.Fatal(err)
	}
	if err := db.Close(); err != nil {
		t.Fatal(err)
	}
	before, _ := os.ReadFile(file)
	for _, args := range [][]string{
		{"weigh", recipe}, {"inspect", recipe}, {"trace", recipe, "reconcile"}, {"since", recipe},
		{"cache", "size"}, {"cache", "check", "--repair"}, {"cache", "trim", "--down-to", "1kB"},
	} {
		status, out, log := steelyard(t, append(args, "--cache", store)...)
		if status != exitFailed || out != "" || !strings.Contains(log, "written by a newer version of this program (layout 99") || !strings.Contains(log, "--cache") {
			t.Errorf("%v: exit status %d: %s%s", args, status, out, log)
		}
	}
	if status, _, log := steelyard(t, "cache", "absorb", "--cache", t.TempDir(), store); status != exitFailed || !strings.Contains(log, "newer version") {
		t.Errorf("absorb: %d, %s", status, log)
	}
	if after, _ := os.ReadFile(file); string(after) != string(before) {
		t.Error("it was not left alone")
	}
}
