// Package trace finds, in the history of a data set, the revisions at which the
// effective speed of a train at a point of the track changed, and the revision
// that each piece of today's profile dates from.
//
// Positions and trains are those of the newest revision. In an older one, a
// position is matched by its chainage and occurrence (package align), and the
// route by its id, whatever its folder is called. A revision whose data set does
// not load is a gap: nothing is known there, and the revisions on both sides of
// it are compared with each other.
//
//	h, err := trace.NewReader(repo, ".").History(ctx, tip, "SM1", trace.Options{})
//	trail := h.View(codes.Nominal, false).Point(train, 1200*unit.Metre)
//	for _, step := range trail.Steps { ... }
//
// # What a step is
//
// The parents of a commit are, here, the nearest commits before it whose data
// set loads. A commit is a step where its speed differs from that of all its
// parents; of a merge this is so only if no branch brought the speed. With
// FirstParent, only the line of first parents exists. A revision without the
// route, the direction or the position has no such track: that is a value like
// a speed, written as 0.
//
// The package knows no SQL. History is made by a Reader from the repository, or
// by package index from what it has kept.
package trace

import (
	"encoding/hex"
	"fmt"

	"speedtrail/schema"
)

// Hash is the hash of a Git object.
type Hash [20]byte

// ParseHash reads 40 hexadecimal digits.
func ParseHash(s string) (h Hash, err error) {
	if len(s) != 2*len(h) {
		return h, fmt.Errorf("%q is not a hash of 40 digits", s)
	}
	_, err = hex.Decode(h[:], []byte(s))
	return h, err
}

// String gives 40 hexadecimal digits.
func (h Hash) String() string { return hex.EncodeToString(h[:]) }

// Commit is a commit of a history.
type Commit struct {
	Hash    Hash
	Parents []int32 // indices in History.Commits, as far as this clone goes
	When    int64   // of the committer, in seconds since 1970
	// Gap says why the data set does not load: the first fault. It is empty
	// where it does.
	Gap string
	// Cut tells that a shallow clone ends here: there were parents.
	Cut bool
}

// What a commit has in place of a version.
const (
	NoTrack int32 = -1 // the data set loads and has no such route, or there is none yet
	Gap     int32 = -2 // the data set does not load
)

// Version is a route as one or more commits have it.
type Version struct {
	Tree   Hash          // of its folder
	Folder string        // "routes/..."
	Route  *schema.Route // with what a profile is compiled from
}

// History is the past of one route.
type History struct {
	// Commits holds parents before their children.
	Commits  []Commit
	Tip      int32   // the newest revision
	State    []int32 // of each commit: an index in Versions, NoTrack or Gap
	Versions []Version
}

// Newest gives the route as the newest revision has it; nil where that has none.
func (h *History) Newest() *schema.Route {
	if s := h.State[h.Tip]; s >= 0 {
		return h.Versions[s].Route
	}
	return nil
}

// Descendants tells of every commit whether it is the given one or comes after
// it.
func (h *History) Descendants(of int32) []bool {
	after := make([]bool, len(h.Commits))
	after[of] = true
	for i := of + 1; i < int32(len(h.Commits)); i++ {
		for _, p := range h.Commits[i].Parents {
			after[i] = after[i] || after[p]
		}
	}
	return after
}

// Ancestors tells of every commit whether it is the given one or comes before it.
func (h *History) Ancestors(of int32) []bool {
	before := make([]bool, len(h.Commits))
	before[of] = true
	for i := of; i >= 0; i-- {
		if before[i] {
			for _, p := range h.Commits[i].Parents {
				before[p] = true
			}
		}
	}
	return before
}

// Index finds a commit.
func (h *History) Index(hash Hash) (int32, bool) {
	// What is asked for is mostly new.
	for i := len(h.Commits) - 1; i >= 0; i-- {
		if h.Commits[i].Hash == hash {
			return int32(i), true
		}
	}
	return 0, false
}
