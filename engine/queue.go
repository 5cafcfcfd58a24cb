package engine

// readyQueue is a heap of steps that can start: the longest chain first, then
// the order of the graph.
type readyQueue struct {
	steps []step
	items []int
}

func (q *readyQueue) Len() int { return len(q.items) }
func (q *readyQueue) Less(a, b int) bool {
	i, j := q.items[a], q.items[b]
	if q.steps[i].chain != q.steps[j].chain {
		return q.steps[i].chain > q.steps[j].chain
	}
	return i < j
}
func (q *readyQueue) Swap(a, b int) { q.items[a], q.items[b] = q.items[b], q.items[a] }
func (q *readyQueue) Push(x any)    { q.items = append(q.items, x.(int)) }
func (q *readyQueue) Pop() any {
	last := len(q.items) - 1
	i := q.items[last]
	q.items = q.items[:last]
	return i
}
