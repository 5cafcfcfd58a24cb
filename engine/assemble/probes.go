// Package assemble turns a recipe into a graph of nodes and the outputs of the
// nodes into a weighing. It is the one place where the workflow and the
// astronomy meet.
package assemble

import (
	"steelyard/probes/dynamics"
	"steelyard/probes/estimate"
	"steelyard/probes/lensing"
	"steelyard/probes/method"
	"steelyard/probes/reported"
	"steelyard/probes/xray"
	"steelyard/recipes"
)

// Probes lists the probes a recipe may use, in the order the manual prints them.
func Probes() []estimate.Probe {
	return []estimate.Probe{xray.Probe, lensing.Probe, dynamics.Probe}
}

// Load reads a recipe and checks it against the methods there are.
func Load(path string) (*recipes.Recipe, recipes.Diagnostics) {
	var declared []method.Probe
	for _, p := range Probes() {
		declared = append(declared, p.Declare())
	}
	return recipes.Load(path, declared, reported.Settings())
}

func probe(name string) estimate.Probe {
	for _, p := range Probes() {
		if p.Name == name {
			return p
		}
	}
	panic("assemble: a recipe names the probe " + name + ", which is not declared")
}
