package engine

import (
	"errors"
	"fmt"
	"slices"
	"strings"
)

// Graph is a set of nodes that can be run: their IDs are unique, what they read
// is among them, and none depends on itself.
type Graph struct {
	nodes      []Node
	index      map[string]int
	inputs     [][]int // per node, in the order of Node.Inputs
	dependents [][]int // per node, each once, ascending
	order      []int   // every node after its inputs
}

// NewGraph checks nodes and gives their graph. The error names everything that
// is wrong with them.
func NewGraph(nodes []Node) (*Graph, error) {
	g := &Graph{
		nodes:      slices.Clone(nodes),
		index:      make(map[string]int, len(nodes)),
		inputs:     make([][]int, len(nodes)),
		dependents: make([][]int, len(nodes)),
	}
	var errs []error
	for i := range g.nodes {
		n := &g.nodes[i]
		if n.ID == "" || n.Run == nil {
			errs = append(errs, fmt.Errorf("%snode %q of kind %q: a node needs an ID and a Run", at(n.Where), n.ID, n.Kind))
		}
		if j, taken := g.index[n.ID]; taken {
			errs = append(errs, fmt.Errorf("%snode %q is there twice, first at %s", at(n.Where), n.ID, orUnknown(g.nodes[j].Where)))
			continue
		}
		g.index[n.ID] = i
	}
	for i := range g.nodes {
		n := &g.nodes[i]
		for _, id := range n.Inputs {
			j, ok := g.index[id]
			if !ok {
				errs = append(errs, fmt.Errorf("%snode %q reads %q, which is not in the graph", at(n.Where), n.ID, id))
				continue
			}
			g.inputs[i] = append(g.inputs[i], j)
			if d := g.dependents[j]; len(d) == 0 || d[len(d)-1] != i {
				g.dependents[j] = append(d, i)
			}
		}
	}
	if len(errs) == 0 {
		if cycle := g.sort(); cycle != nil {
			errs = append(errs, g.cycleError(cycle))
		}
	}
	if len(errs) > 0 {
		return nil, fmt.Errorf("the graph cannot be run: %w", errors.Join(errs...))
	}
	return g, nil
}

// Len is the number of nodes.
func (g *Graph) Len() int { return len(g.nodes) }

// Node gives a node by its ID, nil when there is none.
func (g *Graph) Node(id string) *Node {
	if i, ok := g.index[id]; ok {
		return &g.nodes[i]
	}
	return nil
}

// sort orders the nodes, or gives one cycle among them. It does not recurse, for
// a chain may be as long as the graph.
func (g *Graph) sort() (cycle []int) {
	const unseen, open, done = 0, 1, 2
	state := make([]int, len(g.nodes))
	next := make([]int, len(g.nodes)) // which input to look at next
	for root := range g.nodes {
		if state[root] != unseen {
			continue
		}
		path := []int{root}
		state[root] = open
		for len(path) > 0 {
			i := path[len(path)-1]
			if next[i] == len(g.inputs[i]) {
				state[i] = done
				g.order = append(g.order, i)
				path = path[:len(path)-1]
				continue
			}
			j := g.inputs[i][next[i]]
			next[i]++
			switch state[j] {
			case open:
				return path[slices.Index(path, j):]
			case unseen:
				state[j] = open
				path = append(path, j)
			}
		}
	}
	return nil
}

func (g *Graph) cycleError(cycle []int) error {
	var b strings.Builder
	b.WriteString("these nodes wait for each other: ")
	for _, i := range cycle {
		n := &g.nodes[i]
		fmt.Fprintf(&b, "%q (%s) reads ", n.ID, orUnknown(n.Where))
	}
	fmt.Fprintf(&b, "%q", g.nodes[cycle[0]].ID)
	return errors.New(b.String())
}

func at(where string) string {
	if where == "" {
		return ""
	}
	return where + ": "
}

func orUnknown(where string) string {
	if where == "" {
		return "an unknown place"
	}
	return where
}
