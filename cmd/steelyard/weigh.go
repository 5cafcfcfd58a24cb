package main

import (
	"context"
	"errors"
	"fmt"
	"math"
	"time"

	"github.com/spf13/cobra"

	"steelyard/cache"
	"steelyard/engine"
	"steelyard/engine/weighing"
	"steelyard/recipes"
)

func weighCommand(o *options) *cobra.Command {
	var failAbove float64
	c := &cobra.Command{
		Use:   "weigh RECIPE...",
		Short: "Do what is missing, then print masses, tensions and the verdict",
		Long: `Reads each recipe, computes whatever of it is not in the store yet, and prints the masses, the
tension between them at matched radii, and the verdict. With --json, one object a recipe, one a line.`,
		Example: "  steelyard weigh recipes/examples/curlew/recipe.hcl\n  steelyard weigh --json --fail-above 3 cluster.hcl",
		Args:    cobra.MinimumNArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			if cmd.Flags().Changed("fail-above") && !(failAbove > 0) {
				return &exit{exitWrong, fmt.Errorf("--fail-above %g: a positive number of sigma is needed", failAbove)}
			}
			return o.weigh(cmd.Context(), args, failAbove)
		},
	}
	c.Flags().Float64Var(&failAbove, "fail-above", 0, "exit with status 3 when any tension exceeds this many sigma")
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
	status := exitDone
	for i, path := range paths {
		w, err := o.weighOne(ctx, store, path)
		if w != nil {
			if printErr := o.print(w, i > 0); printErr != nil {
				return &exit{exitFailed, printErr}
			}
		}
		if err == nil {
			err = judge(w, failAbove)
		}
		var e *exit
		switch {
		case err == nil:
		case errors.As(err, &e):
			status = worse(status, e.status)
		default:
			status = worse(status, exitFailed)
		}
		if text := errorText(err); text != "" {
			fmt.Fprintf(o.err, "steelyard: error: %s\n", text)
		}
		if ctx.Err() != nil {
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
	report, err := engine.Run(ctx, p.graph, store, engine.Options{
		Recipe: p.path, Workers: o.workers, Program: version(), Events: display.event,
	})
	display.close()
	o.warn(report.Warnings())
	if err != nil {
		return nil, &exit{exitFailed, err}
	}
	w, err := p.plan.Fill(ctx, report)
	if err != nil {
		return nil, &exit{exitFailed, err}
	}
	if err := remember(store, p.path, w); err != nil {
		o.warn([]string{err.Error()})
	}
	if n := len(w.Failures); n > 0 {
		return w, &exit{exitFailed, fmt.Errorf("%s: %s failed, and what depends on it was not computed", path, plural(n, "node"))}
	}
	return w, nil
}

// remember records a weighing in the store's history.
func remember(store *cache.Store, recipe string, w *weighing.Weighing) error {
	body, err := w.Record()
	if err != nil {
		return err
	}
	_, err = store.Remember(cache.Weighing{Recipe: recipe, Finished: time.Now().UTC(), Program: version()}, body)
	return err
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
