package main

import (
	"context"
	"io"
	"os"
	"os/exec"
	"path/filepath"
	"testing"
)

// asProgram makes the test binary behave as the program itself, so that tests
// can start processes of it.
const asProgram = "STEELYARD_TEST_AS_PROGRAM"

func TestMain(m *testing.M) {
	if os.Getenv(asProgram) != "" {
		main()
	}
	os.Exit(m.Run())
}

func benchmarkWeigh(b *testing.B, store func() string) {
	b.Helper()
	recipe := filepath.Join(example, "recipe.hcl")
	for b.Loop() {
		if status := run(context.Background(), []string{"weigh", "--quiet", "--cache", store(), recipe}, io.Discard, io.Discard); status != exitDone {
			b.Fatalf("exit status %d", status)
		}
	}
}

// BenchmarkExampleFromNothing weighs the example into an empty store.
func BenchmarkExampleFromNothing(b *testing.B) {
	benchmarkWeigh(b, b.TempDir)
}

// BenchmarkExampleUnchanged weighs the example again, within one process.
func BenchmarkExampleUnchanged(b *testing.B) {
	store := b.TempDir()
	run(context.Background(), []string{"weigh", "--quiet", "--cache", store, filepath.Join(example, "recipe.hcl")}, io.Discard, io.Discard)
	benchmarkWeigh(b, func() string { return store })
}

func benchmarkProcess(b *testing.B, args ...string) {
	b.Helper()
	for b.Loop() {
		cmd := exec.Command(os.Args[0], args...)
		cmd.Env = append(os.Environ(), asProgram+"=1")
		if err := cmd.Run(); err != nil {
			b.Fatal(err)
		}
	}
}

// BenchmarkExampleUnchangedProcess weighs the example again, process start
// included.
func BenchmarkExampleUnchangedProcess(b *testing.B) {
	store, recipe := b.TempDir(), filepath.Join(example, "recipe.hcl")
	run(context.Background(), []string{"weigh", "--quiet", "--cache", store, recipe}, io.Discard, io.Discard)
	benchmarkProcess(b, "weigh", "--quiet", "--cache", store, recipe)
}

// BenchmarkProcessStart only prints the version: what the one above takes beyond
// this is the work.
func BenchmarkProcessStart(b *testing.B) {
	benchmarkProcess(b, "--version")
}
