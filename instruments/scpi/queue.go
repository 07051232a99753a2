package scpi

// ErrorQueue is the first-in first-out error queue of an instrument. When it
// is full the newest entry becomes -350, "Queue overflow": earlier errors are
// kept, later ones lost (Keithley 2000 ch. 4, Xantrex XDC app. D).
type ErrorQueue struct {
	depth  int
	faults []Fault
}

// NewErrorQueue makes a queue for depth entries, at least one.
func NewErrorQueue(depth int) *ErrorQueue { return &ErrorQueue{depth: max(depth, 1)} }

// Push adds an entry.
func (q *ErrorQueue) Push(f Fault) {
	if len(q.faults) < q.depth {
		q.faults = append(q.faults, f)
		return
	}
	q.faults[q.depth-1] = NewFault(QueueOverflow, "")
}

// Next takes the oldest entry; of an empty queue it is 0, "No error".
func (q *ErrorQueue) Next() Fault {
	if len(q.faults) == 0 {
		return NewFault(0, "")
	}
	f := q.faults[0]
	q.faults = q.faults[1:]
	return f
}

// Len is the count of entries.
func (q *ErrorQueue) Len() int { return len(q.faults) }

// Clear empties the queue.
func (q *ErrorQueue) Clear() { q.faults = nil }
