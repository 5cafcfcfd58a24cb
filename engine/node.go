// Package engine runs a graph of cached nodes. It knows no astronomy: a node is
// a pure function from bytes to bytes, known by its kind, the kind's version,
// its parameters and the digests of what it reads.
//
// NewGraph checks a set of nodes, Inspect says what running them would do and
// why, Run does it and gives a Report, Explain says why a node was last computed
// again. A node's key is the hash of a readable transcript (key.go); because
// it holds the digests of the inputs' outputs, a rerun stops where an output
// comes out as it was. A node counts as finished when its output is committed
// to the store, so that a run can be interrupted or killed at any instant and
// taken up again.
package engine

import "context"

// Node is one step of a graph.
type Node struct {
	ID      string // unique in the graph, readable: "lensing.shapes.nfw"
	Kind    string // what it computes: "lensing/tangential-shear"
	Version int    // of the kind; raised when equal inputs would give other bytes
	// Params is the transcript of everything but inputs and files that the
	// output depends on: one unambiguous fact a line, in a fixed order.
	Params []string
	Inputs []string // IDs of the nodes whose outputs it reads
	Files  []string // paths of the files it reads; they enter the key by content
	Where  string   // the place in the recipe it came from, "recipe.hcl:12", for messages
	// Run computes the output. It must not read anything but the Job.
	Run func(context.Context, Job) (Output, error)
}

// Job is what a running node may use.
type Job struct {
	Key     [32]byte                                      // the node's key, from which random streams derive
	Input   func(id string) ([]byte, error)               // output of one of Node.Inputs, read when asked for
	File    func(path string) (content string, err error) // path of a file holding exactly the bytes that were hashed
	Workers int                                           // goroutines it may use
	Report  func(done float64)                            // progress, 0 to 1; may be called from any goroutine
}

// Output is what a node yields. Equal outputs must be equal bytes.
type Output struct {
	Bytes       []byte
	Diagnostics []string // kept in the record, shown by trace; not part of the output's digest
}
