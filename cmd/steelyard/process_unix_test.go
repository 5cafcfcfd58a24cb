//go:build unix

package main

import (
	"os"
	"os/exec"
	"strings"
	"syscall"
	"testing"
	"time"
)

// process is the program running on its own.
type process struct {
	*exec.Cmd
	out, log screen
}

func start(t *testing.T, args ...string) *process {
	t.Helper()
	p := &process{Cmd: exec.Command(os.Args[0], args...)}
	p.Env = append(os.Environ(), asProgram+"=1")
	p.Stdout, p.Stderr = &p.out, &p.log
	if err := p.Start(); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { p.Process.Kill() })
	return p
}

// endless is a recipe that takes far longer to weigh than any test waits.
func endless(t *testing.T) string {
	t.Helper()
	recipe := dunlin(t)
	edit(t, recipe, "draws = 200", "draws = 100000")
	return recipe
}

// While a long run computes, others read and write the same store. An interrupt
// then ends it with a message, and everything it said it had computed is kept.
func TestLongRunBesideOthers(t *testing.T) {
	recipe, store := endless(t), t.TempDir()
	long := start(t, "weigh", "--workers", "1", "--cache", store, recipe)
	long.log.await(t, "computed lensing.shear.profile.reduced", 1)
	out, log := succeed(t, "inspect", "--cache", store, recipe)
	if !strings.Contains(out, "to compute") || strings.Contains(log, "warning") {
		t.Errorf("inspect: %s%s", out, log)
	}
	if _, log = succeed(t, "weigh", "--cache", store, dunlin(t)); strings.Contains(log, "failed") || strings.Contains(log, "warning") {
		t.Errorf("a short run beside it: %s", log)
	}
	if s := sizeOf(t, store); s.Weighings != 1 || len(s.Recipes) != 2 {
		t.Errorf("%+v", s)
	}
	if c := checked(t, exitDone, "--cache", store); len(c.Problems) > 0 {
		t.Errorf("%v", c.Problems)
	}
	if long.ProcessState != nil || strings.Contains(long.log.String(), "nodes:") {
		t.Fatalf("the long run was too short for this test: %s", &long.log)
	}
	began := time.Now()
	long.Process.Signal(os.Interrupt)
	long.Wait()
	// It takes half a second; the limit is for busy machines, and still far less
	// than an undisturbed run takes.
	if took := time.Since(began); took > 10*time.Second {
		t.Errorf("it took %v to end", took)
	}
	if s := long.ProcessState.ExitCode(); s != exitFailed || !strings.Contains(long.log.String(), "interrupted with ") || !strings.Contains(long.log.String(), " nodes done; they are kept") {
		t.Errorf("exit status %d: %s", s, &long.log)
	}
	if long.out.String() != "" {
		t.Errorf("a weighing that is not finished was printed: %s", &long.out)
	}
	out, _ = succeed(t, "inspect", "--cache", store, recipe)
	kept := 0
	for _, line := range strings.Split(long.log.String(), "\n") {
		if id, ok := strings.CutPrefix(line, "computed "); ok {
			id, _, _ = strings.Cut(id, " ")
			kept++
			found := false
			for _, l := range strings.Split(out, "\n") {
				f := strings.Fields(l)
				found = found || len(f) == 2 && f[0] == id && f[1] == "reused"
			}
			if !found {
				t.Errorf("%s was computed and is not kept:\n%s", id, out)
			}
		}
	}
	if kept < 2 {
		t.Errorf("only %d nodes were computed before the interrupt", kept)
	}
}

// A second interrupt does not wait for anything. (Two different signals, since
// two of a kind may arrive as one.)
func TestSecondInterrupt(t *testing.T) {
	p := start(t, "weigh", "--workers", "1", "--cache", t.TempDir(), endless(t))
	p.log.await(t, "computed lensing.shear.profile.table", 1)
	p.Process.Signal(os.Interrupt)
	p.Process.Signal(syscall.SIGTERM)
	p.Wait()
	if s := p.ProcessState.ExitCode(); s != exitFailed || strings.Contains(p.log.String(), "interrupted") {
		t.Errorf("exit status %d: %s", s, &p.log)
	}
}

// With several recipes, an interrupt says which were not weighed.
func TestInterruptBetweenRecipes(t *testing.T) {
	first, second := endless(t), dunlin(t)
	p := start(t, "weigh", "--workers", "1", "--cache", t.TempDir(), first, second)
	p.log.await(t, "computed lensing.shear.profile.table", 1)
	p.Process.Signal(os.Interrupt)
	p.Wait()
	if s := p.ProcessState.ExitCode(); s != exitFailed || !strings.Contains(p.log.String(), first+": interrupted with") || !strings.Contains(p.log.String(), "interrupted before "+second) {
		t.Errorf("exit status %d: %s", s, &p.log)
	}
}
