package trace

import (
	"fmt"

	"speedtrail/schema"
)

// Assembly puts a History together from commits, parents before children, and
// from what each has of the route otherwise than its base.
type Assembly struct {
	h     History
	route string
	index map[Hash]int32
	bases []int32 // of each commit: the nearest at or before it, along first parents, that loads; -1: none
	known map[place]int32
	err   error
}

type place struct {
	tree   Hash
	folder string
}

func newAssembly(route string) *Assembly {
	return &Assembly{route: route, index: map[Hash]int32{}, known: map[place]int32{}}
}

// NewAssembly begins the history of a route over commits that are known, and of
// each the nearest at or before it, along first parents, that loads; -1: none.
// Next goes from one to the next.
func NewAssembly(route string, commits []Commit, bases []int32) *Assembly {
	return &Assembly{
		route: route, known: map[place]int32{}, bases: bases,
		h: History{Commits: commits, State: make([]int32, 0, len(commits))},
	}
}

// Next goes to the next commit, which has the route as its base has it.
func (a *Assembly) Next() {
	c := &a.h.Commits[len(a.h.State)]
	state := NoTrack
	switch {
	case c.Gap != "":
		state = Gap
	case len(c.Parents) > 0:
		if base := a.bases[c.Parents[0]]; base >= 0 {
			state = a.h.State[base]
		}
	}
	a.h.State = append(a.h.State, state)
}

// Add adds a commit that has the route as its base has it.
func (a *Assembly) Add(c Commit) {
	i := int32(len(a.h.Commits))
	base := i
	if c.Gap != "" {
		base = -1
		if len(c.Parents) > 0 {
			base = a.bases[c.Parents[0]]
		}
	}
	a.h.Commits = append(a.h.Commits, c)
	a.bases = append(a.bases, base)
	a.index[c.Hash] = i
	a.Next()
}

// Gone says of the last commit that it does not have the route.
func (a *Assembly) Gone() { a.Set(int32(len(a.h.State)-1), NoTrack) }

// Has says of the last commit how it has the route. The function gives the route
// when the version was not met before.
func (a *Assembly) Has(tree Hash, folder string, route func() (*schema.Route, error)) {
	a.Set(int32(len(a.h.State)-1), a.Version(tree, folder, route))
}

// Set says how a commit has the route.
func (a *Assembly) Set(commit, state int32) { a.h.State[commit] = state }

// Version gives the number of a version.
func (a *Assembly) Version(tree Hash, folder string, route func() (*schema.Route, error)) int32 {
	p := place{tree, folder}
	if s, ok := a.known[p]; ok {
		return s
	}
	r, err := route()
	if err == nil && r == nil {
		err = fmt.Errorf("route %s at tree %s was not read", a.route, tree)
	}
	if err != nil {
		a.err = err
		return NoTrack
	}
	s := int32(len(a.h.Versions))
	a.h.Versions = append(a.h.Versions, Version{tree, folder, inFolder(r, folder)})
	a.known[p] = s
	return s
}

// History gives the history up to a commit, which must have been added.
func (a *Assembly) History(tip Hash) (*History, error) {
	if a.err != nil {
		return nil, a.err
	}
	i, ok := a.h.Index(tip)
	if !ok {
		return nil, fmt.Errorf("commit %s is not among those that were read", tip)
	}
	a.h.Tip = i
	return &a.h, nil
}
