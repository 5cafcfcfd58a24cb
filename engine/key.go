package engine

import (
	"encoding/hex"
	"fmt"
	"strconv"

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
	b := fmt.Appendf(make([]byte, 0, 512), "steelyard key %d\n", keyFormat)
	b = append(strconv.AppendQuote(append(b, "kind "...), n.Kind), '\n')
	b = append(strconv.AppendInt(append(b, "version "...), int64(n.Version), 10), '\n')
	b = append(strconv.AppendQuote(append(b, "arithmetic "...), arithmetic), '\n')
	for _, p := range n.Params {
		b = append(strconv.AppendQuote(append(b, "param "...), p), '\n')
	}
	for _, d := range inputs {
		b = append(hex.AppendEncode(append(b, "input "...), d[:]), '\n')
	}
	for _, d := range files {
		b = append(hex.AppendEncode(append(b, "file "...), d[:]), '\n')
	}
	return string(b)
}
