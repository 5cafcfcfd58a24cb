// Package history keeps what every weighing of a recipe found and how: it
// compares two weighings, and follows one number of a weighing up to the files
// and parameters it came from.
//
// An entry of the history is whole in itself. It has the weighing and, of every
// node, everything that the node's output depended on; so weighings can be
// compared and numbers traced when the outputs are long trimmed away. Only when
// and by which program an output was computed is looked up in the store.
package history

import (
	"encoding/json"
	"fmt"
	"path/filepath"
	"slices"
	"strings"
	"time"

	"steelyard/cache"
	"steelyard/engine"
	"steelyard/engine/weighing"
)

// pastSchema names the form of an entry.
const pastSchema = "steelyard/past/1"

// Past is one weighing as the history keeps it.
type Past struct {
	Weighing *weighing.Weighing
	Nodes    []Node // in the order of the graph, only those that have an output
}

// Node is a node of a past weighing.
type Node struct {
	ID     string   `json:"id"`
	Key    string   `json:"key"` // the transcript: everything the output depends on, one fact a line
	Inputs []string `json:"inputs,omitempty"`
	Files  []string `json:"files,omitempty"` // relative to the recipe's folder, with slashes
	Kind   string   `json:"-"`
	Digest string   `json:"-"` // of the output, hexadecimal
}

// entry is a Past as bytes.
type entry struct {
	Schema   string          `json:"schema"`
	Weighing json.RawMessage `json:"weighing"`
	Nodes    []Node          `json:"nodes"`
}

// Remember records a weighing of a recipe, given by its absolute path, and gives
// its entry, without the levers: whether they were asked for makes no other
// weighing. A weighing that found the same, from the same, as the one before it
// is not recorded again: the entry, no longer fresh, is that of the one before.
func Remember(store *cache.Store, recipe, program string, now time.Time, w *weighing.Weighing, results []engine.Result) (entered cache.Weighing, fresh bool, err error) {
	kept := *w
	kept.Levers = nil
	kept.Nodes = slices.DeleteFunc(slices.Clone(w.Nodes), func(n weighing.Node) bool { return isTrial(n.ID) })
	found, err := kept.Record()
	if err != nil {
		return entered, false, err
	}
	nodes := []Node{}
	err = store.View(func(r *cache.Reader) error {
		for i := range results {
			if isTrial(results[i].Node.ID) {
				continue
			}
			if record, _ := r.Record(results[i].Key); record != nil {
				nodes = append(nodes, nodeOf(recipe, results[i].Node, record))
			}
		}
		return nil
	})
	if err != nil {
		return entered, false, err
	}
	body, err := encode(found, nodes)
	if err != nil {
		return entered, false, err
	}
	list, err := List(store, recipe)
	if err != nil {
		return entered, false, err
	}
	if n := len(list); n > 0 && list[n-1].Body == cache.DigestOf(body) {
		if _, err := store.Output(list[n-1].Body); err == nil { // else it was lost, and is stored again
			return list[n-1], false, nil
		}
	}
	entered = cache.Weighing{Recipe: recipe, Finished: now.UTC(), Program: program}
	entered.Number, err = store.Remember(entered, body)
	return entered, true, err
}

// isTrial says that a node tries out another assumption than the recipe's, on the
// search for levers: its name says which.
func isTrial(id string) bool { return strings.Contains(id, " with ") }

// encode writes an entry. It is what entry reads, put together by hand: a JSON
// encoder would go through the weighing once more.
func encode(found []byte, nodes []Node) ([]byte, error) {
	n, err := json.Marshal(nodes)
	if err != nil {
		return nil, err
	}
	body := fmt.Appendf(nil, `{"schema":%q,"weighing":`, pastSchema)
	body = append(append(body, found...), `,"nodes":`...)
	return append(append(body, n...), '}'), nil
}

// nodeOf names inputs and files as this recipe does: the record may come from
// another recipe that has the same node.
func nodeOf(recipe string, n *engine.Node, record *cache.Record) Node {
	node := Node{ID: n.ID, Key: record.Transcript, Inputs: n.Inputs}
	for _, path := range n.Files {
		node.Files = append(node.Files, beside(recipe, path))
	}
	return node
}

// beside writes a path as seen from the folder of the recipe, so that it is the
// same from wherever the program was started.
func beside(recipe, path string) string {
	absolute, err := filepath.Abs(path)
	if err != nil {
		return filepath.ToSlash(path)
	}
	relative, err := filepath.Rel(filepath.Dir(recipe), absolute)
	if err != nil {
		return filepath.ToSlash(absolute)
	}
	return filepath.ToSlash(relative)
}

// Read reads an entry of the history.
func Read(store *cache.Store, w cache.Weighing) (*Past, error) {
	body, err := store.Output(w.Body)
	if err != nil {
		return nil, fmt.Errorf("weighing %d cannot be read: %w", w.Number, err)
	}
	p, err := decode(body)
	if err != nil {
		return nil, fmt.Errorf("weighing %d cannot be read: %w", w.Number, err)
	}
	return p, nil
}

func decode(body []byte) (*Past, error) {
	var e entry
	if err := json.Unmarshal(body, &e); err != nil {
		return nil, err
	}
	if e.Schema != pastSchema {
		return nil, fmt.Errorf("it is of the form %q, expected %q", e.Schema, pastSchema)
	}
	p := &Past{Weighing: new(weighing.Weighing), Nodes: e.Nodes}
	if err := json.Unmarshal(e.Weighing, p.Weighing); err != nil {
		return nil, err
	}
	found := map[string]weighing.Node{}
	for _, n := range p.Weighing.Nodes {
		found[n.ID] = n
	}
	for i := range p.Nodes {
		n := &p.Nodes[i]
		n.Kind, n.Digest = found[n.ID].Kind, found[n.ID].Digest
	}
	return p, nil
}

// node finds a node by its ID, nil when it had no output.
func (p *Past) node(id string) *Node {
	for i := range p.Nodes {
		if p.Nodes[i].ID == id {
			return &p.Nodes[i]
		}
	}
	return nil
}

// digests lists the digests of a node's inputs or files out of its key, in the
// order of their names.
func (n *Node) digests(of string) (list []string) {
	for line := range strings.Lines(n.Key) {
		if digest, ok := strings.CutPrefix(strings.TrimSpace(line), of+" "); ok {
			list = append(list, digest)
		}
	}
	return list
}

// changes says in which facts the keys of two nodes differ.
func changes(before, now *Node) []engine.Change {
	return engine.Changes(before.record(), now.record())
}

func (n *Node) record() *cache.Record {
	r := &cache.Record{Transcript: n.Key}
	for _, id := range n.Inputs {
		r.Inputs = append(r.Inputs, cache.Input{Node: id})
	}
	for _, path := range n.Files {
		r.Files = append(r.Files, cache.File{Path: path})
	}
	return r
}
