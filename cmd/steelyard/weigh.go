package main

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"steelyard/cache"
	"steelyard/engine"
	"steelyard/engine/history"
	"steelyard/engine/weighing"
	"steelyard/recipes"
)

func weighCommand(o *options) *cobra.Command {
	var failAbove float64
	var watch bool
	c := &cobra.Command{
		Use:   "weigh RECIPE...",
		Short: "Do what is missing, then print masses, tensions and the verdict",
		Long: `Reads each recipe, computes whatever of it is not in the store yet, and prints the masses, the
tension between them at matched radii, and the verdict. With --json, one object a recipe, one a line.
What recipes have in common is computed once. An interrupt (Ctrl-C) keeps what is finished; the same
command goes on from there. With --watch, a recipe is weighed again whenever it, a file it includes
or a data file changes, until an interrupt.`,
		Example: "  steelyard weigh recipes/examples/curlew/recipe.hcl\n  steelyard weigh --json --fail-above 3 cluster.hcl\n  steelyard weigh --watch cluster.hcl",
		Args:    cobra.MinimumNArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			if cmd.Flags().Changed("fail-above") && !(failAbove > 0) {
				return &exit{exitWrong, fmt.Errorf("--fail-above %g: a positive number of sigma is needed", failAbove)}
			}
			if watch {
				return o.watch(cmd.Context(), args, failAbove)
			}
			return o.weigh(cmd.Context(), args, failAbove)
		},
	}
	c.Flags().Float64Var(&failAbove, "fail-above", 0, "exit with status 3 when any tension exceeds this many sigma")
	c.Flags().BoolVar(&o.ask.Levers, "levers", false, "ask what would bring the worst pair to 1σ also where the verdict is consistent")
	c.Flags().BoolVar(&o.ask.Sensitivity, "sensitivity", false, "weigh also without the innermost and outermost bins, and with the cut for members moved")
	c.Flags().BoolVar(&watch, "watch", false, "weigh again whenever a recipe or its data change")
	return c
}

// weigh weighs the recipes one after the other. The worst of their outcomes
// decides the exit status; a recipe that is wrong does not keep the others from
// being weighed.
func (o *options) weigh(ctx context.Context, paths []string, failAbove float64) error {
	store, err := o.open()
	if err != nil {
		return err
	}
	status, printed := exitDone, false
	for i, path := range paths {
		w, err := o.weighOne(ctx, store, path)
		if w != nil {
			if printErr := o.print(w, printed); printErr != nil {
				return &exit{exitFailed, printErr}
			}
			printed = true
		}
		if err == nil {
			err = judge(w, failAbove)
		}
		status = worse(status, statusOf(err))
		if text := errorText(err); text != "" {
			fmt.Fprintf(o.err, "steelyard: error: %s\n", text)
		}
		if ctx.Err() != nil && i+1 < len(paths) {
			status = worse(status, exitFailed)
			if context.Cause(ctx) != errChanged {
				fmt.Fprintf(o.err, "steelyard: error: interrupted before %s\n", strings.Join(paths[i+1:], ", "))
			}
			break
		}
	}
	if err := store.Close(); err != nil {
		fmt.Fprintf(o.err, "steelyard: warning: %v\n", err)
	}
	o.warn(store.Warnings())
	if status != exitDone {
		return &exit{status, nil}
	}
	return nil
}

// statusOf is the exit status that an error stands for.
func statusOf(err error) int {
	var e *exit
	switch {
	case err == nil:
		return exitDone
	case errors.As(err, &e):
		return e.status
	}
	return exitFailed
}

func errorText(err error) string {
	if err == nil {
		return ""
	}
	return err.Error()
}

// worse orders the exit statuses: a wrong recipe before a failure before a
// tension.
func worse(a, b int) int {
	rank := map[int]int{exitDone: 0, exitTension: 1, exitFailed: 2, exitWrong: 3}
	if rank[b] > rank[a] {
		return b
	}
	return a
}

func (o *options) weighOne(ctx context.Context, store *cache.Store, path string) (*weighing.Weighing, error) {
	p, err := o.read(path)
	if err != nil {
		return nil, err
	}
	display := o.progress()
	report, err := o.execute(ctx, store, p, display)
	display.close()
	o.warn(display.untold(report.Warnings()))
	switch {
	case errors.Is(err, errChanged):
		return nil, &exit{exitFailed, nil} // watch says why
	case err != nil && ctx.Err() != nil:
		done := report.Count(engine.Computed) + report.Count(engine.Reused)
		err = fmt.Errorf("%s: interrupted with %d of %s done; they are kept, and the same command goes on from there",
			path, done, plural(p.graph.Len(), "node"))
		fallthrough
	case err != nil:
		return nil, &exit{exitFailed, err}
	}
	told := len(report.Warnings())
	w, err := p.plan.Fill(ctx, report)
	o.warn(report.Warnings()[told:]) // outputs that had to be computed again after all
	if err != nil {
		return nil, &exit{exitFailed, err}
	}
	entry, fresh, err := history.Remember(store, p.path, version(), time.Now(), w, report.Results())
	if err != nil {
		o.warn([]string{err.Error()})
	} else {
		display.recorded(entry, fresh)
	}
	if n := len(w.Failures); n > 0 {
		return w, &exit{exitFailed, fmt.Errorf("%s: %s failed, and what depends on it was not computed", path, plural(n, "node"))}
	}
	return w, nil
}

func (o *options) print(w *weighing.Weighing, again bool) error {
	if o.json {
		return w.WriteJSON(o.out)
	}
	if again {
		fmt.Fprintln(o.out)
	}
	return w.WriteText(o.out)
}

// judge holds the tensions to the limit set on the command line.
func judge(w *weighing.Weighing, failAbove float64) error {
	if failAbove == 0 {
		return nil
	}
	for _, t := range w.Tensions {
		if math.Abs(t.Sigma) > failAbove {
			return &exit{exitTension, fmt.Errorf("%s / %s at %s: %.1f sigma, above the %g allowed", t.A, t.B, t.At, math.Abs(t.Sigma), failAbove)}
		}
	}
	return nil
}

func (o *options) warn(texts []string) {
	for _, text := range texts {
		fmt.Fprintf(o.err, "steelyard: warning: %s\n", text)
	}
}

// count says how many mistakes there are.
func count(ds recipes.Diagnostics) string {
	n := 0
	for _, d := range ds {
		if d.Severity == recipes.Error {
			n++
		}
	}
	if n == 1 {
		return "there is a mistake"
	}
	return fmt.Sprintf("there are %d mistakes", n)
}

func plural(n int, noun string) string {
	if n == 1 {
		return "1 " + noun
	}
	return fmt.Sprintf("%d %ss", n, noun)
}
