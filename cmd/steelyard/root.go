package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"runtime"
	"runtime/debug"

	"github.com/spf13/cobra"

	"steelyard/cache"
	"steelyard/engine/assemble"
)

// Exit statuses.
const (
	exitDone    = 0
	exitFailed  = 1 // something could not be computed
	exitWrong   = 2 // the recipe or the command line is wrong
	exitTension = 3 // above the tension allowed
)

// exit is an error that decides the exit status; its text, if any, was not yet
// printed.
type exit struct {
	status int
	err    error
}

func (e *exit) Error() string {
	if e.err == nil {
		return ""
	}
	return e.err.Error()
}

func (e *exit) Unwrap() error { return e.err }

// options are the settings common to the commands.
type options struct {
	cache   string
	workers int
	json    bool
	quiet   bool
	ask     assemble.Ask
	out     io.Writer
	err     io.Writer
}

const about = `Steelyard weighs one object (a galaxy cluster, a group, a massive galaxy) by its hot gas in
hydrostatic equilibrium, by the light it bends and by the motions of its galaxies, brings the masses
to the same radius and cosmology, and says whether they agree and by how many sigma.

A recipe declares the object, its data and the estimates to make. Start with the example:

  steelyard weigh recipes/examples/curlew/recipe.hcl`

// run is the whole program: it takes arguments and writers and gives an exit
// status.
func run(ctx context.Context, args []string, stdout, stderr io.Writer) int {
	o := &options{out: stdout, err: stderr}
	root := &cobra.Command{
		Use: "steelyard", Short: "Weigh one object by gas, light and motions", Long: about,
		SilenceUsage: true, SilenceErrors: true, Version: version(),
		CompletionOptions: cobra.CompletionOptions{HiddenDefaultCmd: true},
	}
	root.SetArgs(append([]string{}, args...)) // nil would mean those of the process
	root.SetOut(stdout)
	root.SetErr(stderr)
	flags := root.PersistentFlags()
	flags.StringVar(&o.cache, "cache", "", "folder of the store (default: steelyard in your cache folder)")
	flags.IntVar(&o.workers, "workers", runtime.GOMAXPROCS(0), "nodes computed at a time")
	flags.BoolVar(&o.json, "json", false, "print JSON, one object a line")
	flags.BoolVar(&o.quiet, "quiet", false, "no progress")
	root.SetFlagErrorFunc(func(_ *cobra.Command, err error) error { return &exit{exitWrong, err} })
	root.AddCommand(weighCommand(o), inspectCommand(o), traceCommand(o), sinceCommand(o), cacheCommand(o), methodsCommand(o))

	err := root.ExecuteContext(ctx)
	if err == nil {
		return exitDone
	}
	var e *exit
	if !errors.As(err, &e) {
		e = &exit{exitWrong, err} // cobra's own: an unknown command, a missing argument
	}
	if text := e.Error(); text != "" {
		fmt.Fprintf(stderr, "steelyard: error: %s\n", text)
	}
	return e.status
}

// open opens the store.
func (o *options) open() (*cache.Store, error) {
	if o.workers < 1 {
		return nil, &exit{exitWrong, fmt.Errorf("--workers %d: at least one is needed", o.workers)}
	}
	dir := o.cache
	if dir == "" {
		base, err := os.UserCacheDir()
		if err != nil {
			return nil, &exit{exitWrong, fmt.Errorf("there is no cache folder (%w); name one with --cache DIR", err)}
		}
		dir = filepath.Join(base, "steelyard")
	}
	s, err := cache.Open(dir, cache.Options{Limit: 4 << 30})
	if err != nil {
		return nil, &exit{exitFailed, err}
	}
	return s, nil
}

// version is what the build knows of itself.
func version() string {
	info, ok := debug.ReadBuildInfo()
	if !ok {
		return "unknown"
	}
	v := info.Main.Version
	for _, s := range info.Settings {
		if s.Key == "vcs.revision" && len(s.Value) >= 12 {
			v += " " + s.Value[:12]
		}
		if s.Key == "vcs.modified" && s.Value == "true" {
			v += " with changes"
		}
	}
	return v
}
