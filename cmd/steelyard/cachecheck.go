package main

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"math/rand/v2"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"steelyard/cache"
	"steelyard/engine"
	"steelyard/engine/layout"
)

func cacheCheckCommand(o *options) *cobra.Command {
	var repair bool
	var sample int
	c := &cobra.Command{
		Use:   "check [RECIPE...]",
		Short: "Verify every checksum in the store, and on request compute a sample again",
		Long: `Reads everything in the store and verifies every checksum. Damaged outputs are never used: they are
computed again when they are needed. --repair removes them now. --recompute N computes N nodes of the
recipes named again, picked at random among those whose outputs are stored, and compares them to the
last bit.`,
		Example: "  steelyard cache check\n  steelyard cache check --recompute 5 cluster.hcl",
		RunE: func(cmd *cobra.Command, args []string) error {
			switch {
			case cmd.Flags().Changed("recompute") && sample < 1:
				return &exit{exitWrong, fmt.Errorf("--recompute %d: at least one node is needed", sample)}
			case sample > 0 && len(args) == 0:
				return &exit{exitWrong, errors.New("--recompute needs recipes: only they say how to compute a node")}
			case sample == 0 && len(args) > 0:
				return &exit{exitWrong, errors.New("the checksums of the whole store are verified: recipes are for --recompute N only")}
			}
			return o.cacheCheck(cmd.Context(), repair, sample, args)
		},
	}
	c.Flags().BoolVar(&repair, "repair", false, "remove what is damaged")
	c.Flags().IntVar(&sample, "recompute", 0, "compute so many nodes of the recipes again and compare")
	return c
}

// storeCheck is what cache check --json prints.
type storeCheck struct {
	Schema     string       `json:"schema"`
	Folder     string       `json:"folder"`
	Records    int          `json:"records"` // that verify, like the next two
	Outputs    int          `json:"outputs"`
	Weighings  int          `json:"weighings"`
	Bytes      int64        `json:"bytes"`
	Problems   []string     `json:"problems"`
	Recomputed []recomputed `json:"recomputed"`
}

type recomputed struct {
	Recipe string `json:"recipe"`
	Node   string `json:"node"`
	Same   bool   `json:"same"`
	Reason string `json:"reason,omitempty"` // why not
}

func (o *options) cacheCheck(ctx context.Context, repair bool, sample int, recipes []string) error {
	store, err := o.open()
	if err != nil {
		return err
	}
	defer store.Close()
	found, err := store.Check(ctx, repair)
	if err != nil {
		o.warn(store.Warnings())
		return &exit{exitFailed, err}
	}
	check := storeCheck{
		"steelyard/check/1", store.Dir(), found.Records, found.Outputs, found.Weighings, found.Bytes,
		append([]string{}, found.Problems...), []recomputed{},
	}
	if sample > 0 {
		if check.Recomputed, err = o.recompute(ctx, store, sample, recipes); err != nil {
			return err
		}
	}
	o.warn(store.Warnings())
	if o.json {
		err = json.NewEncoder(o.out).Encode(check)
	} else {
		err = o.describeCheck(check, repair)
	}
	if err != nil {
		return &exit{exitFailed, err}
	}
	bad := len(check.Problems)
	for _, r := range check.Recomputed {
		if !r.Same {
			bad++
		}
	}
	if bad > 0 {
		return &exit{exitFailed, fmt.Errorf("%s in the store", plural(bad, "problem"))}
	}
	return nil
}

func (o *options) describeCheck(c storeCheck, repair bool) error {
	var b strings.Builder
	fmt.Fprintf(&b, "%s: %s, %s and %s verify, %s\n", c.Folder, plural(c.Records, "record"), plural(c.Outputs, "output"), plural(c.Weighings, "weighing"), layout.Bytes(c.Bytes))
	for _, p := range c.Problems {
		layout.Wrap(&b, "  ", 2, p)
	}
	switch {
	case len(c.Problems) == 0:
	case repair:
		b.WriteString("  removed; what they held is computed again when it is needed\n")
	default:
		b.WriteString("  none of it will be used; --repair removes it\n")
	}
	for _, r := range c.Recomputed {
		if r.Same {
			fmt.Fprintf(&b, "computed %s again: the same\n", r.Node)
		} else {
			layout.Wrap(&b, "", 2, fmt.Sprintf("computed %s again: %s", r.Node, r.Reason))
		}
	}
	_, err := o.out.Write([]byte(b.String()))
	return err
}

// kept is a recipe's graph as far as its outputs are stored.
type kept struct {
	path  string
	graph *engine.Graph
	ids   []string
}

// recompute computes nodes of recipes again, picked at random among those stored,
// and compares them with what is stored.
func (o *options) recompute(ctx context.Context, store *cache.Store, sample int, paths []string) ([]recomputed, error) {
	var all []kept
	total := 0
	for _, path := range paths {
		k, err := o.keptOf(ctx, store, path)
		if err != nil {
			return nil, err
		}
		all, total = append(all, k), total+len(k.ids)
	}
	if total == 0 {
		return nil, &exit{exitFailed, errors.New("nothing of these recipes is in the store: weigh them first")}
	}
	seed := uint64(time.Now().UnixNano()) // another sample every time
	picked := map[int]bool{}
	for _, i := range rand.New(rand.NewPCG(seed, 0)).Perm(total)[:min(sample, total)] {
		picked[i] = true
	}
	list := []recomputed{}
	first := 0
	for _, k := range all {
		wanted := map[string]bool{}
		for i, id := range k.ids {
			if picked[first+i] {
				wanted[id] = true
			}
		}
		first += len(k.ids)
		display := o.progress()
		report, err := engine.Run(ctx, k.graph, store, engine.Options{
			Recipe: k.path, Workers: o.workers, Program: version(), Events: display.event,
			Verify: func(id string) bool { return wanted[id] },
		})
		display.clear()
		if err != nil {
			return nil, &exit{exitFailed, err}
		}
		for _, id := range k.ids {
			if !wanted[id] {
				continue
			}
			r := recomputed{Recipe: k.path, Node: id}
			if result := report.Result(id); result.Err != nil {
				r.Reason = result.Err.Error()
			} else {
				r.Same = result.Verified
			}
			list = append(list, r)
		}
	}
	return list, nil
}

// keptOf cuts a recipe's graph down to the nodes whose outputs are stored, so
// that nothing else is computed.
func (o *options) keptOf(ctx context.Context, store *cache.Store, path string) (k kept, err error) {
	p, err := o.read(path)
	if err != nil {
		return k, err
	}
	prospects, err := engine.Inspect(ctx, p.graph, store, engine.Options{Recipe: p.path, Workers: o.workers})
	if err != nil {
		return k, &exit{exitFailed, err}
	}
	var nodes []engine.Node
	for _, q := range prospects {
		if q.State == engine.Reused {
			nodes, k.ids = append(nodes, *q.Node), append(k.ids, q.Node.ID)
		}
	}
	k.path = p.path
	if k.graph, err = engine.NewGraph(nodes); err != nil {
		return k, &exit{exitFailed, err}
	}
	return k, nil
}
