package main

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"time"

	"steelyard/engine/assemble"
	"steelyard/recipes"
)

const (
	lookEvery = 100 * time.Millisecond // how often watched files are looked at
	settled   = 400 * time.Millisecond // files must stay as they are for so long
)

// errChanged is why a weighing was given up: what it reads has changed.
var errChanged = errors.New("its files have changed")

// watch weighs recipes whenever they or their files change, until an interrupt.
// The last outcome decides the exit status.
func (o *options) watch(ctx context.Context, paths []string, failAbove float64) error {
	w := watcher{files: map[string][]string{}}
	todo := paths
	for {
		before := w.look(paths)
		round, giveUp := context.WithCancelCause(ctx)
		changed := make(chan bool, 1)
		go func() {
			changed <- w.change(ctx, before)
			giveUp(errChanged)
		}()
		err := o.weigh(round, todo, failAbove)
		finished := round.Err() == nil
		if finished {
			o.say("watching %s and %s; Ctrl-C ends it", enumerate(paths), plural(w.others(), "other file"))
		}
		if !<-changed {
			o.say("no longer watching")
			return err
		}
		now := w.settle(ctx)
		if finished {
			todo = nil
		}
		for _, path := range paths {
			if !slices.Contains(todo, path) && w.differ(path, before, now) {
				todo = append(todo, path)
			}
		}
		names := slices.DeleteFunc(differing(before, now), isFolder)
		if len(names) > 0 {
			o.say("%s changed: weighing again", enumerate(names))
		}
	}
}

// say tells the user what goes on.
func (o *options) say(format string, args ...any) {
	if !o.quiet {
		fmt.Fprintf(o.err, "\n"+format+"\n", args...)
	}
}

func enumerate(files []string) string {
	const most = 4
	if len(files) > most {
		return fmt.Sprintf("%s and %d more", strings.Join(files[:most], ", "), len(files)-most)
	}
	return strings.Join(files, ", ")
}

// watcher knows which files each recipe depends on.
type watcher struct {
	files map[string][]string // by recipe
}

// stamp is what tells that a file has changed.
type stamp struct {
	size     int64
	modified time.Time
	missing  bool
}

// look finds out which files the recipes depend on, and how these are now.
func (w *watcher) look(paths []string) map[string]stamp {
	for _, path := range paths {
		w.files[path] = filesOf(path, w.files[path])
	}
	return w.stamps()
}

func (w *watcher) stamps() map[string]stamp {
	stamps := map[string]stamp{}
	for _, files := range w.files {
		for _, file := range files {
			if info, err := os.Stat(file); err == nil {
				stamps[file] = stamp{size: info.Size(), modified: info.ModTime()}
			} else {
				stamps[file] = stamp{missing: true}
			}
		}
	}
	return stamps
}

// filesOf lists the files that a recipe depends on. While it has a mistake these
// are those that it had before, those with mistakes, and the folder, in which a
// missing file may appear.
func filesOf(path string, before []string) []string {
	recipe, diagnostics := assemble.Load(path)
	files := []string{path}
	if recipe == nil {
		files = append(append(files, filepath.Dir(path)), before...)
		for _, d := range diagnostics {
			files = append(files, d.File)
		}
	} else {
		files = append(files, recipe.Files...)
		for _, b := range recipe.Blocks {
			files = append(files, dataFiles(b.Data)...)
		}
	}
	slices.Sort(files)
	return slices.Compact(files)
}

func dataFiles(data []recipes.Data) (files []string) {
	for _, d := range data {
		if d.Path != "" {
			files = append(files, d.Path)
		}
		files = append(files, dataFiles(d.Nested)...)
	}
	return files
}

func isFolder(path string) bool {
	info, err := os.Stat(path)
	return err == nil && info.IsDir()
}

// change waits until some file is not as it was; false means that ctx ended.
func (w *watcher) change(ctx context.Context, before map[string]stamp) bool {
	ticker := time.NewTicker(lookEvery)
	defer ticker.Stop()
	for {
		select {
		case <-ctx.Done():
			return false
		case <-ticker.C:
		}
		if len(differing(before, w.stamps())) > 0 {
			return true
		}
	}
}

// settle waits until the files have stayed as they are for a while, and gives
// their state.
func (w *watcher) settle(ctx context.Context) map[string]stamp {
	now := w.stamps()
	for since := time.Now(); time.Since(since) < settled && ctx.Err() == nil; {
		time.Sleep(lookEvery)
		if then := now; len(differing(then, w.stamps())) > 0 {
			now, since = w.stamps(), time.Now()
		}
	}
	return now
}

// differ says whether some file of a recipe differs.
func (w *watcher) differ(path string, before, now map[string]stamp) bool {
	return slices.ContainsFunc(w.files[path], func(file string) bool { return before[file] != now[file] })
}

// others counts the files beside the recipes themselves.
func (w *watcher) others() int {
	return len(w.stamps()) - len(w.files)
}

func differing(before, now map[string]stamp) (files []string) {
	for file, was := range before {
		if now[file] != was {
			files = append(files, file)
		}
	}
	slices.Sort(files)
	return files
}
