package main

import (
	"errors"
	"fmt"
	"path/filepath"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"steelyard/cache"
	"steelyard/engine/layout"
)

func cacheTrimCommand(o *options) *cobra.Command {
	var age, size string
	c := &cobra.Command{
		Use:   "trim [RECIPE...]",
		Short: "Remove what is not needed and give the space back",
		Long: `Removes outputs from the store: those that only the recipes named used last, those unused for an age,
and then the longest unused until no more than a size is left. What is removed is computed again when
it is needed. The record of past weighings stays.`,
		Example: "  steelyard cache trim --unused-for 90d\n  steelyard cache trim --down-to 2GB\n  steelyard cache trim old/recipe.hcl",
		RunE: func(_ *cobra.Command, args []string) error {
			t, err := trimOf(age, size, args, time.Now())
			if err != nil {
				return &exit{exitWrong, err}
			}
			return o.cacheTrim(t)
		},
	}
	c.Flags().StringVar(&age, "unused-for", "", "remove what was not used for so long: 36h, 90d, 12w")
	c.Flags().StringVar(&size, "down-to", "", "then remove the longest unused until no more than this is left: 500MB, 2GB")
	return c
}

// trimOf reads what the command line asks to be removed.
func trimOf(age, size string, recipes []string, now time.Time) (t cache.Trim, err error) {
	if age == "" && size == "" && len(recipes) == 0 {
		return t, errors.New("say what to remove: --unused-for 90d, --down-to 2GB, or a recipe")
	}
	if age != "" {
		old, err := parseAge(age)
		if err != nil {
			return t, err
		}
		t.Before = now.Add(-old)
	}
	if size != "" {
		if t.Bytes, err = parseSize(size); err != nil {
			return t, err
		}
	}
	for _, r := range recipes {
		path, err := filepath.Abs(r)
		if err != nil {
			return t, err
		}
		t.Recipes = append(t.Recipes, path)
	}
	return t, nil
}

var amount = regexp.MustCompile(`^([0-9]+(?:\.[0-9]+)?) ?([A-Za-z]+)$`)

// parseAmount reads a positive number and its unit.
func parseAmount(s string, units map[string]float64) (float64, bool) {
	m := amount.FindStringSubmatch(s)
	if m == nil {
		return 0, false
	}
	x, err := strconv.ParseFloat(m[1], 64)
	unit, ok := units[strings.ToLower(m[2])]
	return x * unit, err == nil && ok && x*unit >= 1 && x*unit < 1e18
}

func parseAge(s string) (time.Duration, error) {
	hours, ok := parseAmount(s, map[string]float64{"h": 1, "d": 24, "w": 7 * 24})
	if !ok || hours > 1e6 {
		return 0, fmt.Errorf("--unused-for %s: an age in hours, days or weeks is needed, such as 36h, 90d or 12w", s)
	}
	return time.Duration(hours * float64(time.Hour)), nil
}

func parseSize(s string) (int64, error) {
	bytes, ok := parseAmount(s, map[string]float64{
		"b": 1, "kb": 1e3, "mb": 1e6, "gb": 1e9, "tb": 1e12, "kib": 1 << 10, "mib": 1 << 20, "gib": 1 << 30, "tib": 1 << 40,
	})
	if !ok {
		return 0, fmt.Errorf("--down-to %s: a size is needed, such as 500MB or 2GB", s)
	}
	return int64(bytes), nil
}

func (o *options) cacheTrim(t cache.Trim) error {
	store, err := o.open()
	if err != nil {
		return err
	}
	defer store.Close()
	if err := knownRecipes(store, t.Recipes); err != nil {
		return err
	}
	trimmed, err := store.Trim(t)
	o.warn(store.Warnings())
	if err != nil {
		return &exit{exitFailed, err}
	}
	usage, err := store.Size()
	if err != nil {
		return &exit{exitFailed, err}
	}
	fmt.Fprintf(o.out, "%s: removed %s; %s given back, %s left\n", store.Dir(), plural(trimmed.Records, "output"),
		layout.Bytes(max(0, trimmed.Bytes)), layout.Bytes(usage.Bytes))
	return nil
}

// knownRecipes refuses recipes of which the store holds nothing: their names are
// probably mistyped.
func knownRecipes(store *cache.Store, recipes []string) error {
	if len(recipes) == 0 {
		return nil
	}
	usage, err := store.Size()
	if err != nil {
		return &exit{exitFailed, err}
	}
	var names []string
	for _, r := range usage.Recipes {
		names = append(names, r.Recipe)
	}
	for _, r := range recipes {
		if slices.Contains(names, r) {
			continue
		}
		if near := nearest(r, names); near != "" {
			return &exit{exitWrong, fmt.Errorf("the store holds nothing of %s; did you mean %s?", r, near)}
		}
		return &exit{exitWrong, fmt.Errorf("the store holds nothing of %s; steelyard cache size lists what it holds", r)}
	}
	return nil
}
