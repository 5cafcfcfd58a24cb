package history

import (
	"fmt"
	"time"

	"steelyard/cache"
)

// provDocument is a document of PROV-JSON (Huynh et al. 2013, The PROV-JSON
// Serialization, W3C Member Submission): for every kind of element or relation,
// its members by name.
type provDocument map[string]map[string]provElement

type provElement map[string]any

// Prov writes the trace as PROV-JSON, to be marshalled: files and outputs are
// entities, nodes are activities, versions of the program are agents, and the
// recipe is the plan they followed. An output is named by its node's key, a file
// by its content.
func (t *Trace) Prov() map[string]any {
	d := provDocument{}
	d.add("entity", "steelyard:recipe", provElement{
		"prov:type": name("prov:Plan"), "prov:label": t.Recipe,
	})
	nodes := map[string]*Traced{}
	for i := range t.Nodes {
		n := &t.Nodes[i]
		nodes[n.ID] = n
		activity, output := "node:"+n.Key, "output:"+n.Key
		d.activity(n, activity)
		d.add("entity", output, provElement{
			"prov:type": name("steelyard:Output"), "prov:label": n.ID, "steelyard:sha256": n.Output,
		})
		generated := provElement{"prov:entity": output, "prov:activity": activity}
		if n.Computed != nil {
			generated["prov:time"] = instant(n.Computed.Finished)
		}
		d.relate("wasGeneratedBy", generated)
		for _, f := range n.Files {
			file := "file:" + f.Digest
			d.add("entity", file, provElement{
				"prov:type": name("steelyard:File"), "prov:label": f.Name, "prov:location": f.Name, "steelyard:sha256": f.Digest,
			})
			d.used(activity, output, file)
		}
		for _, in := range n.Inputs {
			d.used(activity, output, d.asUsed(n, nodes[in.Name]))
		}
	}
	document := map[string]any{"prefix": map[string]string{
		"steelyard": "urn:steelyard:", "node": "urn:steelyard:node:", "output": "urn:steelyard:output:",
		"file": "urn:steelyard:file:", "bytes": "urn:steelyard:bytes:", "program": "urn:steelyard:program:",
	}}
	for kind, members := range d {
		document[kind] = members
	}
	return document
}

// activity adds a node and the program that ran it.
func (d provDocument) activity(n *Traced, id string) {
	parameters := []string{}
	for _, p := range n.Parameters {
		parameters = append(parameters, p.Name+" = "+p.Value)
	}
	a := provElement{
		"prov:type": name("steelyard:Node"), "prov:label": n.ID,
		"steelyard:kind": n.Kind, "steelyard:version": n.Version, "steelyard:parameter": parameters,
	}
	d.add("activity", id, a)
	c := n.Computed
	if c == nil {
		return
	}
	a["prov:startTime"] = instant(c.started())
	a["prov:endTime"] = instant(c.Finished)
	if len(c.Diagnostics) > 0 {
		a["steelyard:diagnostic"] = c.Diagnostics
	}
	// A version may hold what a name must not.
	agent := "program:" + cache.DigestOf([]byte(c.Program)).Short()
	d.add("agent", agent, provElement{
		"prov:type": name("prov:SoftwareAgent"), "prov:label": "steelyard " + c.Program,
	})
	d.relate("wasAssociatedWith", provElement{"prov:activity": id, "prov:agent": agent, "prov:plan": "steelyard:recipe"})
}

// asUsed is the entity that a node found in an input. An input that was computed
// again since, and came out the same, was another entity then: one of the same
// bytes, of whose making nothing is said.
func (d provDocument) asUsed(n, input *Traced) string {
	output := "output:" + input.Key
	if n.Computed == nil || input.Computed == nil || !input.Computed.Finished.After(n.Computed.started()) {
		return output
	}
	bytes := "bytes:" + input.Output
	d.add("entity", bytes, provElement{
		"prov:type": name("steelyard:Bytes"), "prov:label": "what " + input.ID + " gives", "steelyard:sha256": input.Output,
	})
	d.relate("specializationOf", provElement{"prov:specificEntity": output, "prov:generalEntity": bytes})
	return bytes
}

// used says that an activity made an output from something.
func (d provDocument) used(activity, output, from string) {
	d.relate("used", provElement{"prov:activity": activity, "prov:entity": from})
	d.relate("wasDerivedFrom", provElement{"prov:generatedEntity": output, "prov:usedEntity": from, "prov:activity": activity})
}

func (d provDocument) add(kind, id string, e provElement) {
	if d[kind] == nil {
		d[kind] = map[string]provElement{}
	}
	if d[kind][id] == nil {
		d[kind][id] = e
	}
}

// relate adds a relation, which needs no name of its own.
func (d provDocument) relate(kind string, e provElement) {
	d.add(kind, fmt.Sprintf("_:%s%d", kind, len(d[kind])+1), e)
}

// name is a qualified name as a value.
func name(qualified string) map[string]string {
	return map[string]string{"$": qualified, "type": "prov:QUALIFIED_NAME"}
}

// started is when the node that computed an output began.
func (c *Computed) started() time.Time {
	return c.Finished.Add(-time.Duration(c.Seconds * float64(time.Second)))
}

func instant(t time.Time) string { return t.UTC().Format(time.RFC3339Nano) }
