package assemble

import (
	"fmt"

	"github.com/hashicorp/hcl/v2"

	"steelyard/engine"
	"steelyard/probes/cosmology"
	"steelyard/probes/estimate"
	"steelyard/probes/infer"
	"steelyard/probes/method"
	"steelyard/probes/prior"
	"steelyard/recipes"
)

// place is where something stands in the recipe, for messages.
func place(r hcl.Range) string { return fmt.Sprintf("%s:%d", r.Filename, r.Start.Line) }

// backgroundFacts are the facts that every node knowing the object depends on.
func (p *Plan) backgroundFacts() []string {
	facts := []string{"redshift = " + exact(p.object.Redshift)}
	if p.object.HasCentre {
		facts = append(facts, "centre = "+exact(p.object.RA)+" "+exact(p.object.Dec))
	}
	return append(facts, cosmologyFact(p.background))
}

func cosmologyFact(c *cosmology.Cosmology) string {
	q := c.Params()
	return "cosmology = " + exact(q.HubbleConstant) + " " + exact(q.OmegaMatter) + " " + exact(q.OmegaLambda) +
		" " + exact(q.W0) + " " + exact(q.Wa) + " " + exact(q.CMBTemperature)
}

// exact renders a number for a node's key.
var exact = method.Digits

// samplingFacts are the facts that a node which draws depends on: how many
// draws, from which seed, and the versions of the code all of them share.
func (p *Plan) samplingFacts() []string {
	s := p.Recipe.Sampling
	return []string{
		fmt.Sprintf("draws = %d", s.Draws), fmt.Sprintf("seed = %d", s.Seed),
		fmt.Sprintf("estimate_version = %d", estimate.Version), fmt.Sprintf("infer_version = %d", infer.Version),
	}
}

// settingsFacts renders the settings of a named block.
func settingsFacts(name string, s method.Settings) []string {
	facts := []string{name + " = present"}
	for _, line := range s.Transcript() {
		facts = append(facts, name+"."+line)
	}
	return facts
}

// lengths converts the angles among settings that stand for lengths, with the
// angular-diameter distance of the object.
func (p *Plan) lengths(s method.Settings, declared []method.Setting) method.Settings {
	distance := p.background.AngularDiameter(p.object.Redshift)
	out := method.Settings{}
	for name, v := range s {
		if v.Set && v.Unit == "rad" && isLength(declared, name) {
			v.Unit = "kpc"
			v.Prior = scaled(v.Prior, distance)
			numbers := make([]float64, len(v.Numbers))
			for i, x := range v.Numbers {
				numbers[i] = x * distance
			}
			v.Numbers = numbers
		}
		out[name] = v
	}
	return out
}

func isLength(declared []method.Setting, name string) bool {
	for _, d := range declared {
		if d.Name == name {
			return d.Length
		}
	}
	return false
}

// scaled is the prior of a quantity multiplied by a positive number.
func scaled(p prior.Prior, by float64) prior.Prior {
	p.A *= by
	if p.Kind != prior.LogNormalKind { // whose B is a logarithm's spread
		p.B *= by
	}
	p.C *= by
	return p
}

// task prepares what a reduction or a method is given; inputs fill it in when
// the node runs.
func (p *Plan) task(name string, data []recipes.Data, declared []method.Block, own method.Settings) *estimate.Task {
	t := &estimate.Task{Name: name, Object: p.object, Cosmology: p.background, Settings: own, Blocks: map[string]method.Settings{}}
	var walk func(prefix string, data []recipes.Data, declared []method.Block)
	walk = func(prefix string, data []recipes.Data, declared []method.Block) {
		for _, d := range data {
			b := findBlock(declared, d.Kind)
			t.Blocks[prefix+d.Kind] = p.lengths(d.Settings, b.Settings)
			walk(prefix+d.Kind+".", d.Nested, b.Blocks)
		}
	}
	walk("", data, declared)
	return t
}

func findBlock(declared []method.Block, name string) method.Block {
	for _, b := range declared {
		if b.Name == name {
			return b
		}
	}
	panic("assemble: a recipe has the data block " + name + ", which is not declared")
}

// sampling gives a node its random stream, derived from the facts of its key
// that do not change with the data or the machine: new data then move a mass by
// what they say, without a jitter of fresh random numbers on top.
func (p *Plan) sampling(n *engine.Node, job engine.Job) infer.Options {
	facts := append([]string{n.Kind, fmt.Sprint(n.Version)}, n.Params...)
	return infer.Options{Draws: p.Recipe.Sampling.Draws, Stream: infer.NewStream(facts...), Workers: job.Workers}
}
