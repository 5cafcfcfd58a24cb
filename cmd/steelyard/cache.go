package main

import (
	"encoding/json"
	"errors"
	"fmt"
	"os"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"steelyard/engine/history"
	"steelyard/engine/layout"
)

func cacheCommand(o *options) *cobra.Command {
	c := &cobra.Command{
		Use:   "cache",
		Short: "Look after the store: its size, its soundness, what to keep",
		Long: `Everything computed is kept in a store, a folder shared by all recipes: steelyard in your cache folder,
or the one that --cache names. It may be removed at any time: what it held is computed again, but the
record of past weighings is in it too.`,
		Args: cobra.NoArgs,
		RunE: func(cmd *cobra.Command, _ []string) error { return cmd.Help() },
	}
	c.AddCommand(cacheSizeCommand(o), cacheCheckCommand(o), cacheTrimCommand(o), cacheAbsorbCommand(o))
	return c
}

func cacheSizeCommand(o *options) *cobra.Command {
	return &cobra.Command{
		Use:     "size",
		Short:   "What is in the store, and for which recipes",
		Long:    "Adds up what the store holds. What several recipes share counts for each of them.",
		Example: "  steelyard cache size",
		Args:    cobra.NoArgs,
		RunE:    func(*cobra.Command, []string) error { return o.cacheSize() },
	}
}

// storeSize is what cache size --json prints.
type storeSize struct {
	Schema    string       `json:"schema"`
	Folder    string       `json:"folder"`
	Bytes     int64        `json:"bytes"`
	Database  int64        `json:"database_bytes"` // of them
	Records   int          `json:"records"`
	Weighings int          `json:"weighings"`
	Recipes   []recipeSize `json:"recipes"`
}

type recipeSize struct {
	Recipe    string    `json:"recipe"`
	There     bool      `json:"there"` // the file still exists
	Nodes     int       `json:"nodes"`
	Bytes     int64     `json:"bytes"`
	Weighings int       `json:"weighings"`
	Used      time.Time `json:"used"`
}

func (o *options) cacheSize() error {
	store, err := o.open()
	if err != nil {
		return err
	}
	defer store.Close()
	usage, err := store.Size()
	o.warn(store.Warnings())
	if err != nil {
		return &exit{exitFailed, err}
	}
	size := storeSize{"steelyard/store/1", store.Dir(), usage.Bytes, usage.Database, usage.Records, usage.Weighings, []recipeSize{}}
	for _, r := range usage.Recipes {
		_, err := os.Stat(r.Recipe)
		size.Recipes = append(size.Recipes, recipeSize{r.Recipe, err == nil, r.Nodes, r.Bytes, r.Weighings, r.Used})
	}
	if o.json {
		err = json.NewEncoder(o.out).Encode(size)
	} else {
		err = o.describeSize(size)
	}
	if err != nil {
		return &exit{exitFailed, err}
	}
	return nil
}

func (o *options) describeSize(s storeSize) error {
	var b strings.Builder
	fmt.Fprintf(&b, "%s: %s, %s, %s\n", s.Folder, layout.Bytes(s.Bytes), plural(s.Records, "output"), plural(s.Weighings, "weighing"))
	if len(s.Recipes) > 0 {
		b.WriteString("\nRecipes\n")
		rows := [][]string{{"", "nodes", "size", "weighings", "last used"}}
		for _, r := range s.Recipes {
			name := r.Recipe
			if !r.There {
				name += " (no longer there)"
			}
			rows = append(rows, []string{name, fmt.Sprint(r.Nodes), layout.Bytes(r.Bytes), fmt.Sprint(r.Weighings), history.Stamp(r.Used.In(time.Local))})
		}
		layout.Table(&b, rows)
	}
	_, err := o.out.Write([]byte(b.String()))
	return err
}

func cacheAbsorbCommand(o *options) *cobra.Command {
	return &cobra.Command{
		Use:   "absorb DIR...",
		Short: "Take over what other stores hold",
		Long: `Copies what the stores in other folders hold and this one does not: outputs, and the record of past
weighings. The other stores stay as they are. Use it for stores that were filled elsewhere, such as
one for each job on a cluster of machines.`,
		Example: "  steelyard cache absorb job-1/store job-2/store",
		Args:    cobra.MinimumNArgs(1),
		RunE: func(cmd *cobra.Command, args []string) error {
			store, err := o.open()
			if err != nil {
				return err
			}
			var failures []error
			for _, dir := range args {
				a, err := store.Absorb(cmd.Context(), dir)
				if err != nil {
					failures = append(failures, fmt.Errorf("%s was not absorbed: %w", dir, err))
				}
				if a != nil {
					fmt.Fprintf(o.out, "%s: took over %s (%s) and %s\n", dir, plural(a.Records, "output"), layout.Bytes(a.Bytes), plural(a.Weighings, "weighing"))
					if a.Skipped > 0 {
						o.warn([]string{fmt.Sprintf("%s: %d were left there, damaged or incomplete", dir, a.Skipped)})
					}
				}
			}
			failures = append(failures, store.Close())
			o.warn(store.Warnings())
			if err := errors.Join(failures...); err != nil {
				return &exit{exitFailed, err}
			}
			return nil
		},
	}
}
