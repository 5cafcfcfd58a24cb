package main

import (
	"context"
	"encoding/json"
	"fmt"
	"strings"

	"github.com/spf13/cobra"

	"steelyard/engine"
	"steelyard/recipes"
)

func inspectCommand(o *options) *cobra.Command {
	return &cobra.Command{
		Use:   "inspect RECIPE",
		Short: "Read everything, compute nothing: what is declared and what would be done",
		Long: `Reads a recipe and its data files, computes nothing, and shows what is declared and what weigh
would do with each node of the work: reused (it is in the store), to compute (and why), or open
(it runs only if something above it comes out different).`,
		Example: "  steelyard inspect recipes/examples/curlew/recipe.hcl",
		Args:    cobra.ExactArgs(1),
		RunE:    func(cmd *cobra.Command, args []string) error { return o.inspect(cmd.Context(), args[0]) },
	}
}

// inspection is what inspect --json prints.
type inspection struct {
	Schema string          `json:"schema"`
	Recipe string          `json:"recipe"`
	Object inspectedObject `json:"object"`
	Nodes  []inspectedNode `json:"nodes"`
}

type inspectedObject struct {
	Name     string  `json:"name"`
	Redshift float64 `json:"redshift"`
}

type inspectedNode struct {
	ID      string   `json:"id"`
	Kind    string   `json:"kind"`
	Where   string   `json:"where"`
	State   string   `json:"state"`
	Because []string `json:"because"`
}

func (o *options) inspect(ctx context.Context, path string) error {
	p, err := o.read(path)
	if err != nil {
		return err
	}
	store, err := o.open()
	if err != nil {
		return err
	}
	defer store.Close()
	prospects, err := engine.Inspect(ctx, p.graph, store, engine.Options{Recipe: p.path, Workers: o.workers})
	o.warn(store.Warnings())
	if err != nil {
		return &exit{exitFailed, err}
	}
	r := p.plan.Recipe
	result := inspection{Schema: "steelyard/inspection/1", Recipe: r.File, Object: inspectedObject{r.Object.Name, r.Object.Redshift}}
	failed := 0
	for _, q := range prospects {
		if q.State == engine.Failed {
			failed++
		}
		result.Nodes = append(result.Nodes, inspectedNode{q.Node.ID, q.Node.Kind, q.Node.Where, string(q.State), because(q)})
	}
	if o.json {
		err = json.NewEncoder(o.out).Encode(result)
	} else {
		err = o.describe(r, result)
	}
	if err != nil {
		return &exit{exitFailed, err}
	}
	if failed > 0 {
		return &exit{exitFailed, fmt.Errorf("%s cannot be computed as things stand", plural(failed, "node"))}
	}
	return nil
}

// because says in words why a node would be computed, or cannot be.
func because(q engine.Prospect) []string {
	reasons := []string{}
	if q.Err != nil {
		reasons = append(reasons, q.Err.Error())
	}
	for _, c := range q.Because {
		reasons = append(reasons, c.String())
	}
	if q.Reason != "" && q.State != engine.Reused {
		reasons = append(reasons, q.Reason)
	}
	return reasons
}

// describe writes an inspection for reading.
func (o *options) describe(r *recipes.Recipe, result inspection) error {
	var b strings.Builder
	fmt.Fprintf(&b, "%s at z = %g, declared in %s\n\n", r.Object.Name, r.Object.Redshift, strings.Join(r.Files, ", "))
	for _, block := range r.Blocks {
		fmt.Fprintf(&b, "%s.%s\n", block.Probe, block.Name)
		describeData(&b, "  ", block.Data)
		for _, e := range block.Estimates {
			fmt.Fprintf(&b, "  estimate %s by %s\n", e.Name, e.Method)
		}
	}
	for _, m := range r.Reported {
		fmt.Fprintf(&b, "reported.%s: a published mass, %s by %s\n", m.Name, m.Probe, m.Via)
	}
	for _, n := range r.Nuisances {
		fmt.Fprintf(&b, "nuisance.%s: %s\n", n.Name, n.Prior)
	}
	if c := r.Reconcile; c != nil {
		var at []string
		for _, place := range c.At {
			at = append(at, place.Text)
		}
		fmt.Fprintf(&b, "compares %s\n  at %s", strings.Join(c.Estimates, ", "), strings.Join(at, ", "))
		if c.RadiiFrom != "" {
			fmt.Fprintf(&b, ", radii from %s", c.RadiiFrom)
		}
		b.WriteByte('\n')
	}
	b.WriteString("\nnodes\n")
	widest := 0
	for _, n := range result.Nodes {
		widest = max(widest, len(n.ID))
	}
	for _, n := range result.Nodes {
		fmt.Fprintf(&b, "  %-*s  %s\n", widest, n.ID, n.State)
		for _, reason := range n.Because {
			fmt.Fprintf(&b, "      %s\n", reason)
		}
	}
	_, err := o.out.Write([]byte(b.String()))
	return err
}

func describeData(b *strings.Builder, indent string, data []recipes.Data) {
	for _, d := range data {
		fmt.Fprintf(b, "%s%s", indent, d.Kind)
		if d.File != "" {
			fmt.Fprintf(b, " from %s", d.File)
		}
		if d.Select != nil {
			fmt.Fprintf(b, " where %s", d.Select.Text())
		}
		b.WriteByte('\n')
		describeData(b, indent+"  ", d.Nested)
	}
}
