package engine

// State is what became, or would become, of a node.
type State string

// The first four are the outcomes of a run; stopped is a node that an interrupt
// kept from finishing. Inspect answers reused, to compute or open.
const (
	Reused    State = "reused"
	Computed  State = "computed"
	Failed    State = "failed"
	Blocked   State = "blocked" // something above it failed
	Stopped   State = "stopped" // the run was interrupted first
	ToCompute State = "to compute"
	Open      State = "open" // runs only if something above it comes out different
)

// EventType says what an event is about.
type EventType string

const (
	Planned  EventType = "planned"  // the graph is read: Finished nodes of Total need nothing
	Started  EventType = "started"  // Node begins
	Progress EventType = "progress" // Node is Done, from 0 to 1
	Finished EventType = "finished" // Node is State; Err when it failed
	Warning  EventType = "warning"  // Text, about the store or a node
)

// Event is something that happened in a run.
type Event struct {
	Type     EventType
	Node     string // "" when it is about the run
	Kind     string // of the node
	State    State
	Done     float64
	Seconds  float64 // what the node took
	Expected float64 // what it should take, 0 when never computed before
	Err      error
	Text     string
	Finished int     // nodes whose outcome is known
	Total    int     // nodes in the graph
	Left     float64 // seconds the run should still take, -1 when unknown
}
