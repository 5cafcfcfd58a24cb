package main

import (
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"steelyard/cache"
	"steelyard/engine"
	"steelyard/engine/history"
)

func traceCommand(o *options) *cobra.Command {
	var which string
	var prov bool
	c := &cobra.Command{
		Use:   "trace RECIPE NAME",
		Short: "Where one number came from: every node, parameter, file and digest above it",
		Long: `Follows one result of the last weighing up to the files it came from: every node with its parameters,
what it read, when and by which version of the program it was computed, and which fact made it be
computed again. NAME is an estimate (lensing.shapes.nfw), a data block (lensing.shapes.galaxies), any
node that inspect lists, or reconcile. --prov writes the same as PROV-JSON, the provenance format of
the W3C.`,
		Example: "  steelyard trace cluster.hcl lensing.shapes.nfw\n  steelyard trace cluster.hcl reconcile --prov > provenance.json",
		Args:    cobra.ExactArgs(2),
		RunE: func(cmd *cobra.Command, args []string) error {
			if prov && o.json {
				return &exit{exitWrong, errors.New("--prov is JSON of its own kind: leave --json away")}
			}
			return o.trace(cmd.Context(), args[0], args[1], which, prov)
		},
	}
	c.Flags().StringVar(&which, "weighing", "", "the weighing, by number or date (default: the last)")
	c.Flags().BoolVar(&prov, "prov", false, "print W3C PROV-JSON")
	return c
}

func (o *options) trace(ctx context.Context, path, name, which string, prov bool) error {
	store, err := o.open()
	if err != nil {
		return err
	}
	defer store.Close()
	past, err := o.past(store, path)
	if err != nil {
		return err
	}
	at := len(past) - 1
	if which != "" {
		if at, err = history.Find(past, which, time.Local); err != nil {
			return &exit{exitWrong, fmt.Errorf("--weighing %s: %w", which, err)}
		}
	}
	t, err := history.Follow(store, past, at, name)
	if err != nil {
		return traceError(err)
	}
	if at == len(past)-1 {
		t.Stale = o.stale(ctx, store, path, t)
	}
	o.warn(store.Warnings())
	switch {
	case prov:
		encoder := json.NewEncoder(o.out)
		encoder.SetIndent("", "  ")
		err = encoder.Encode(t.Prov())
	case o.json:
		err = json.NewEncoder(o.out).Encode(t)
	default:
		err = t.WriteText(o.out, time.Local)
	}
	if err != nil {
		return &exit{exitFailed, err}
	}
	return nil
}

// traceError adds to a name that is not known the nearest that is.
func traceError(err error) error {
	var unknown *history.NameError
	if !errors.As(err, &unknown) || unknown.Known {
		return &exit{exitFailed, err}
	}
	if near := nearest(unknown.Name, unknown.Names); near != "" {
		err = fmt.Errorf("%w; did you mean %s?", err, near)
	} else {
		err = fmt.Errorf("%w; steelyard inspect lists the nodes", err)
	}
	return &exit{exitWrong, err}
}

// stale says why the recipe as it is now would not give what is traced, or "".
func (o *options) stale(ctx context.Context, store *cache.Store, path string, t *history.Trace) string {
	quiet := *o
	quiet.err = io.Discard
	p, err := quiet.read(path)
	if err != nil {
		return "The recipe cannot be read as it is now; this is how it was."
	}
	prospects, err := engine.Inspect(ctx, p.graph, store, engine.Options{Recipe: p.path, Workers: o.workers})
	if err != nil {
		return ""
	}
	digests := map[string]string{}
	for _, q := range prospects {
		if q.State == engine.Reused || q.Reason != "" { // the same, or trimmed
			digests[q.Node.ID] = q.Digest.String()
		}
	}
	for _, n := range t.Nodes {
		if strings.HasSuffix(n.ID, " again") { // of a later round, which inspect does not foresee
			continue
		}
		if digest, same := digests[n.ID]; !same || digest != n.Output && digest != (cache.Digest{}).String() {
			return "The recipe or its data have changed since: steelyard inspect says how, steelyard weigh does it."
		}
	}
	return ""
}
