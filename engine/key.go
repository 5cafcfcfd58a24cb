package engine

import (
	"fmt"
	"strings"

	"steelyard/cache"
)

// keyFormat is the version of the transcript's layout. Raising it recomputes
// everything.
const keyFormat = 1

// transcript writes down everything a node's output depends on, one fact a
// line, text quoted, so that two nodes have one transcript only when they
// compute the same thing. Its hash is the node's key. Inputs and files enter by
// their content and their place in the node's lists, not by their names: a node
// that puts a name into its output must have that name among its Params.
func transcript(n *Node, arithmetic string, inputs, files []cache.Digest) string {
	var b strings.Builder
	fmt.Fprintf(&b, "steelyard key %d\n", keyFormat)
	fmt.Fprintf(&b, "kind %q\n", n.Kind)
	fmt.Fprintf(&b, "version %d\n", n.Version)
	fmt.Fprintf(&b, "arithmetic %q\n", arithmetic)
	for _, p := range n.Params {
		fmt.Fprintf(&b, "param %q\n", p)
	}
	for _, d := range inputs {
		fmt.Fprintf(&b, "input %s\n", d)
	}
	for _, d := range files {
		fmt.Fprintf(&b, "file %s\n", d)
	}
	return b.String()
}
