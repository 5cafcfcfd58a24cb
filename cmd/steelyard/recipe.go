package main

import (
	"fmt"
	"path/filepath"

	"steelyard/engine"
	"steelyard/engine/assemble"
)

// planned is a recipe that was read without a mistake, and its graph.
type planned struct {
	path  string // absolute: the name by which the store knows the recipe
	plan  *assemble.Plan
	graph *engine.Graph
}

// read reads a recipe and plans its graph. What is wrong with it goes to
// standard error, all of it.
func (o *options) read(path string) (*planned, error) {
	recipe, diagnostics := assemble.Load(path)
	if err := diagnostics.Text(o.err); err != nil {
		return nil, err
	}
	if diagnostics.HasErrors() {
		return nil, &exit{exitWrong, fmt.Errorf("%s was not weighed: %s in it", path, count(diagnostics))}
	}
	plan, err := assemble.New(recipe)
	if err != nil {
		return nil, &exit{exitWrong, err}
	}
	graph, err := engine.NewGraph(plan.Nodes)
	if err != nil {
		return nil, &exit{exitFailed, err}
	}
	absolute, err := filepath.Abs(path)
	if err != nil {
		return nil, &exit{exitWrong, err}
	}
	return &planned{absolute, plan, graph}, nil
}
