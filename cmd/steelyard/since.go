package main

import (
	"encoding/json"
	"errors"
	"fmt"
	"path/filepath"
	"time"

	"github.com/spf13/cobra"

	"steelyard/cache"
	"steelyard/engine/history"
)

func sinceCommand(o *options) *cobra.Command {
	var from, to string
	var list bool
	c := &cobra.Command{
		Use:   "since RECIPE",
		Short: "What changed since an earlier weighing: data, assumptions, masses, tensions",
		Long: `Compares two weighings of a recipe: which data files and assumptions changed, and how far each mass
and tension moved in units of its error. Without options, the last two that differ. Weighings are
named by number or by date; a date means the last weighing up to then. Weighing again without a
change makes no new entry.`,
		Example: "  steelyard since cluster.hcl\n  steelyard since cluster.hcl --list\n  steelyard since cluster.hcl --from 3\n  steelyard since cluster.hcl --from 2026-03-31 --to 2026-06-30",
		Args:    cobra.ExactArgs(1),
		RunE: func(_ *cobra.Command, args []string) error {
			if list && from+to != "" {
				return &exit{exitWrong, errors.New("--list lists all weighings: leave --from and --to away")}
			}
			return o.since(args[0], from, to, list)
		},
	}
	c.Flags().StringVar(&from, "from", "", "the earlier weighing, by number or date (default: the one before)")
	c.Flags().StringVar(&to, "to", "", "the later weighing, by number or date (default: the last)")
	c.Flags().BoolVar(&list, "list", false, "list the weighings there are")
	return c
}

func (o *options) since(path, from, to string, list bool) error {
	store, err := o.open()
	if err != nil {
		return err
	}
	defer store.Close()
	past, err := o.past(store, path)
	if err != nil {
		return err
	}
	if list {
		return o.listWeighings(past)
	}
	first, second, err := pair(past, from, to)
	if err != nil {
		return err
	}
	before, err := history.Read(store, past[first])
	if err != nil {
		return &exit{exitFailed, err}
	}
	now, err := history.Read(store, past[second])
	if err != nil {
		return &exit{exitFailed, err}
	}
	c := history.Compare(before, now, history.MarkOf(past[first]), history.MarkOf(past[second]))
	if o.json {
		err = json.NewEncoder(o.out).Encode(c)
	} else {
		err = c.WriteText(o.out, now.Weighing.MassUnit(), time.Local)
	}
	if err != nil {
		return &exit{exitFailed, err}
	}
	return nil
}

// past lists the weighings of a recipe, of which there must be one.
func (o *options) past(store *cache.Store, path string) ([]cache.Weighing, error) {
	recipe, err := filepath.Abs(path)
	if err != nil {
		return nil, &exit{exitWrong, err}
	}
	past, err := history.List(store, recipe)
	o.warn(store.Warnings())
	if err != nil {
		return nil, &exit{exitFailed, err}
	}
	if len(past) > 0 {
		return past, nil
	}
	all, err := store.History("")
	if err != nil {
		return nil, &exit{exitFailed, err}
	}
	var names []string
	for _, w := range all {
		names = append(names, w.Recipe)
	}
	hint := ""
	if near := nearest(recipe, names); near != "" {
		hint = fmt.Sprintf("; did you mean %s?", near)
	}
	return nil, &exit{exitFailed, fmt.Errorf("no weighing of %s is in the store %s%s", recipe, store.Dir(), hint)}
}

// pair picks the weighings to compare.
func pair(past []cache.Weighing, from, to string) (first, second int, err error) {
	second = len(past) - 1
	if to != "" {
		if second, err = history.Find(past, to, time.Local); err != nil {
			return 0, 0, &exit{exitWrong, fmt.Errorf("--to %s: %w", to, err)}
		}
	}
	if from != "" {
		if first, err = history.Find(past, from, time.Local); err != nil {
			return 0, 0, &exit{exitWrong, fmt.Errorf("--from %s: %w", from, err)}
		}
		return first, second, nil
	}
	if second == 0 {
		return 0, 0, &exit{exitFailed, fmt.Errorf("weighing %d of %s is the first on record: there is none before it to compare it with",
			past[0].Number, history.Stamp(past[0].Finished.In(time.Local)))}
	}
	return second - 1, second, nil
}

// listed is a weighing as since --list --json prints it.
type listed struct {
	Schema string `json:"schema"`
	history.Mark
}

func (o *options) listWeighings(past []cache.Weighing) error {
	for _, w := range past {
		var err error
		if o.json {
			err = json.NewEncoder(o.out).Encode(listed{"steelyard/weighing-mark/1", history.MarkOf(w)})
		} else {
			_, err = fmt.Fprintf(o.out, "%4d  %s  by %s\n", w.Number, history.Stamp(w.Finished.In(time.Local)), w.Program)
		}
		if err != nil {
			return &exit{exitFailed, err}
		}
	}
	return nil
}
