package source

import (
	"fmt"
	"slices"
	"strings"
)

// FaultLimit is how many faults of a data set are reported one by one. Those
// past it are counted.
const FaultLimit = 500

// Fault is one thing that is wrong with the input, and where.
type Fault struct {
	Position
	// Problem says in lower case what is wrong and what is allowed.
	Problem string
}

// Error gives "file:line:column: problem".
func (f Fault) Error() string { return f.Position.String() + ": " + f.Problem }

// Faults is everything that is wrong with a data set. It is an error when it
// holds at least one fault.
type Faults struct {
	List  []Fault // at most FaultLimit of them, in order of position
	Count int     // all of them, the unlisted ones included
}

// Error gives one fault a line.
func (f *Faults) Error() string {
	var b strings.Builder
	for i, fault := range f.List {
		if i > 0 {
			b.WriteByte('\n')
		}
		b.WriteString(fault.Error())
	}
	if more := f.Count - len(f.List); more > 0 {
		fmt.Fprintf(&b, "\n%d more faults not listed", more)
	}
	return b.String()
}

// A Collector gathers the faults of one reading. The zero Collector is ready
// for use. It is not safe for concurrent use: parallel readers have one each
// and are joined with Merge.
type Collector struct {
	list  []Fault
	count int
}

// Add records a fault at a position.
func (c *Collector) Add(at Position, format string, args ...any) {
	c.count++
	// Each reader keeps its own first ones: which of them are first over all is
	// known only when the readers have been merged.
	if len(c.list) < FaultLimit {
		c.list = append(c.list, Fault{at, fmt.Sprintf(format, args...)})
	}
}

// Drop takes back the n faults before the last one, which says what they come of.
// Where some of them are only counted, all stay.
func (c *Collector) Drop(n int) {
	if last := len(c.list) - 1; c.count == len(c.list) && n <= last {
		c.list = append(c.list[:last-n], c.list[last])
		c.count -= n
	}
}

// Count returns how many faults were recorded.
func (c *Collector) Count() int { return c.count }

// Merge takes over the faults of another collector.
func (c *Collector) Merge(other *Collector) {
	c.list = append(c.list, other.list...)
	c.count += other.count
}

// Err returns nil where nothing is wrong, else a *Faults.
func (c *Collector) Err() error {
	if c.count == 0 {
		return nil
	}
	list := slices.Clone(c.list)
	slices.SortStableFunc(list, func(a, b Fault) int { return a.Compare(b.Position) })
	return &Faults{List: list[:min(len(list), FaultLimit)], Count: c.count}
}
