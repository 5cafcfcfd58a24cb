package main

import (
	"context"
	"os"
	"path/filepath"
	"strings"
	"sync"
	"testing"
	"time"
)

// screen collects what a running command prints.
type screen struct {
	mu   sync.Mutex
	text strings.Builder
}

func (s *screen) Write(b []byte) (int, error) {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.text.Write(b)
}

func (s *screen) String() string {
	s.mu.Lock()
	defer s.mu.Unlock()
	return s.text.String()
}

// await waits until the screen shows a text so many times. The limit only keeps
// a failing test from hanging.
func (s *screen) await(t *testing.T, text string, times int) {
	t.Helper()
	for range 1200 {
		if strings.Count(s.String(), text) >= times {
			return
		}
		time.Sleep(50 * time.Millisecond)
	}
	t.Fatalf("%q does not appear %d times:\n%s", text, times, s)
}

// weigh --watch weighs again when the recipe or a data file changes, says what is
// wrong and goes on, takes rapid edits for one, leaves other recipes alone, and
// ends with an interrupt.
func TestWatch(t *testing.T) {
	recipe, other, store := dunlin(t), dunlin(t), t.TempDir()
	edit(t, other, "Dunlin", "Sanderling")
	data := filepath.Join(filepath.Dir(recipe), "shear.csv")
	ctx, interrupt := context.WithCancel(t.Context())
	var out, log screen
	status := make(chan int)
	go func() {
		status <- run(ctx, []string{"weigh", "--watch", "--json", "--cache", store, recipe, other}, &out, &log)
	}()
	const waiting = "and 2 other files; Ctrl-C ends it"
	log.await(t, waiting, 1)
	if n := strings.Count(out.String(), "\n"); n != 2 {
		t.Fatalf("%d weighings at first", n)
	}
	for _, value := range []string{"0.076", "0.077", "0.078"} {
		b, err := os.ReadFile(data)
		if err != nil {
			t.Fatal(err)
		}
		edited := strings.Replace(string(b), strings.Split(strings.Split(string(b), "\n")[2], ",")[2], value, 1)
		if err := os.WriteFile(data, []byte(edited), 0o644); err != nil {
			t.Fatal(err)
		}
		time.Sleep(lookEvery)
	}
	log.await(t, waiting, 2)
	if n := strings.Count(out.String(), `"Dunlin"`); n != 2 || strings.Count(log.String(), data+" changed: weighing again") != 1 {
		t.Errorf("three rapid edits gave %d weighings:\n%s", n-1, &log)
	}
	edit(t, recipe, "redshift = 0.184", "redshift = -0.184")
	log.await(t, "was not weighed: there is a mistake in it", 1)
	log.await(t, "Ctrl-C ends it", 3)
	edit(t, recipe, "redshift = -0.184", "redshift = 0.185")
	log.await(t, waiting, 3)
	if n := strings.Count(out.String(), `"redshift":0.185`); n != 1 || strings.Count(out.String(), `"Sanderling"`) != 1 {
		t.Errorf("%d weighings after the mistake:\n%s", n, &log)
	}
	interrupt()
	select {
	case s := <-status:
		if s != exitDone || !strings.HasSuffix(log.String(), "no longer watching\n") {
			t.Errorf("exit status %d:\n%s", s, &log)
		}
	case <-time.After(time.Minute):
		t.Fatal("an interrupt does not end it")
	}
}

// A change while a weighing runs gives that weighing up and starts the next.
func TestWatchStartsAfresh(t *testing.T) {
	recipe, store := dunlin(t), t.TempDir()
	edit(t, recipe, "draws = 200", "draws = 90000") // takes longer than looking at the files
	ctx, interrupt := context.WithCancel(t.Context())
	defer interrupt()
	var out, log screen
	status := make(chan int)
	go func() {
		status <- run(ctx, []string{"weigh", "--watch", "--json", "--workers", "1", "--cache", store, recipe}, &out, &log)
	}()
	log.await(t, "computed lensing.shear.profile.table", 1)
	edit(t, recipe, "draws = 90000", "draws = 200")
	log.await(t, "recipe.hcl changed: weighing again", 1)
	log.await(t, "Ctrl-C ends it", 1)
	interrupt()
	<-status
	if !strings.Contains(out.String(), `"draws":200`) || strings.Contains(out.String(), `"draws":90000`) || strings.Contains(log.String(), "interrupted") {
		t.Errorf("%s\n%s", &out, &log)
	}
}
