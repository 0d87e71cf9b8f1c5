package assessment

import (
	"errors"
	"fmt"
	"iter"
	"slices"
	"strings"

	"speedtrail/history/ledger"
	"speedtrail/schema"
	"speedtrail/schema/source"
	"speedtrail/schema/unit"
)

// farthest is beyond every running distance, in millimetres.
const farthest = int64(schema.MaxJumps+1) * 2 * unit.MaxKM * int64(unit.Kilometre)

// check proves that every index points to something, and that what charts are drawn
// from lies where a chart can, so that nothing that is written from a stored document
// can go wrong.
func (c *Computed) check() error {
	if strings.Trim(c.PreparedSince, "0123456789abcdef") != "" {
		return errors.New("prepared_since is no hash of a commit")
	}
	for i := range c.Routes {
		if err := c.checkRoute(&c.Routes[i]); err != nil {
			return err
		}
	}
	for i := range c.Stretches.List {
		if err := c.checkStretch(&c.Stretches.List[i]); err != nil {
			return fmt.Errorf("stretch %d %w", i, err)
		}
	}
	for i, x := range c.Figures.Curves {
		if !within(len(c.Trains), x.Trains...) {
			return fmt.Errorf("curve %d %w", i, errNotThere)
		}
	}
	return nil
}

var errNotThere = errors.New("points to what is not there")

func (c *Computed) checkRoute(r *Route) error {
	for _, list := range [...][]Change{r.Changes, r.Masked} {
		for k := range list {
			x := &list[k]
			if !within(len(r.Sources), x.BeforeSource, x.AfterSource) || !within(len(r.Causes), x.Cause) || !within(len(c.Trains), x.Trains...) || !c.hasPieces(r, x.Pieces) {
				return fmt.Errorf("change %d of route %s %w", k, source.Quote(r.ID), errNotThere)
			}
			if !areSpeeds(x.Before, x.After) || !ascend(x.Start, x.Start+x.Length) {
				return fmt.Errorf("change %d of route %s has a speed or a place that cannot be", k, source.Quote(r.ID))
			}
		}
	}
	for _, t := range r.Track {
		if !c.hasPieces(r, t.Pieces) {
			return fmt.Errorf("the track of route %s %w", source.Quote(r.ID), errNotThere)
		}
	}
	for _, list := range r.Causes {
		for _, x := range list {
			if !within(len(c.Source), x.File) || !within(len(c.Source[x.File].Rows), x.Row) {
				return fmt.Errorf("a cause of route %s %w", source.Quote(r.ID), errNotThere)
			}
		}
	}
	return nil
}

func (c *Computed) checkStretch(s *Stretch) error {
	if !within(len(c.Routes), s.Route) || len(s.Changes) == 0 || !within(len(c.Routes[s.Route].Changes), s.Changes...) || !within(len(c.Trains), s.Trains...) {
		return errNotThere
	}
	for _, x := range slices.Concat(s.Before, s.After) {
		if !within(len(c.Routes[s.Route].Sources), x.Source) {
			return errNotThere
		}
		if !areSpeeds(x.Speed) || !ascend(x.From, x.To) {
			return errors.New("has a speed or a place that cannot be")
		}
	}
	if !ascend(s.WindowFrom, s.From, s.To, s.WindowTo, s.RouteLength) {
		return errors.New("has a place that cannot be")
	}
	return nil
}

// areSpeeds tells of numbers in km/h whether each can be a speed, 0 for none.
func areSpeeds(list ...int) bool {
	return !slices.ContainsFunc(list, func(v int) bool { return v < 0 || v > int(unit.MaxSpeed) })
}

// ascend tells of one number or more in millimetres whether they are places of a track
// in its order.
func ascend(list ...int64) bool {
	return slices.IsSorted(list) && list[0] >= 0 && list[len(list)-1] <= farthest
}

// within tells whether every index is one of n elements.
func within(n int, list ...int) bool {
	return !slices.ContainsFunc(list, func(i int) bool { return i < 0 || i >= n })
}

// hasPieces tells whether a list of pieces is there, and the declarations in it.
// Where requests were not looked at there is none.
func (c *Computed) hasPieces(r *Route, i int) bool {
	if c.Options.NoRequests && i == 0 {
		return true
	}
	if i < 0 || i >= len(r.Pieces) {
		return false
	}
	declarations := 0
	for _, q := range c.Requests {
		declarations += len(q.Declares)
	}
	return !slices.ContainsFunc(r.Pieces[i], func(p Piece) bool { return p.By < -1 || p.By >= declarations })
}

// Row is a change as one train sees it.
type Row struct {
	Route  *Route
	Change *Change
	Train  string // id
}

// Rows runs over the changes, one a train and stretch, in the order of rules:
// route, direction, position, train.
func (c *Computed) Rows() iter.Seq[Row] {
	return func(yield func(Row) bool) {
		var next []int
		for i := range c.Routes {
			route := &c.Routes[i]
			changes := route.Changes
			// Changes that begin at one place are told apart by their trains.
			for len(changes) > 0 {
				n := 1
				for n < len(changes) && changes[n].Direction == changes[0].Direction && changes[n].Start == changes[0].Start {
					n++
				}
				next = append(next[:0], make([]int, n)...)
				for k := least(changes[:n], next); k >= 0; k = least(changes[:n], next) {
					train := changes[k].Trains[next[k]]
					if !yield(Row{Route: route, Change: &changes[k], Train: c.Trains[train].ID}) {
						return
					}
					next[k]++
				}
				changes = changes[n:]
			}
		}
	}
}

// least finds the change whose next train has the least number; -1 where none
// has a train left.
func least(changes []Change, next []int) int {
	found := -1
	for k := range changes {
		if next[k] < len(changes[k].Trains) && (found < 0 || changes[k].Trains[next[k]] < changes[found].Trains[next[found]]) {
			found = k
		}
	}
	return found
}

// LedgerRecord gives the document as the ledger writes it.
func LedgerRecord(d *Document, body []byte, digest string) ledger.Record {
	c := &d.Computed
	r := ledger.Record{
		Digest: digest, Body: body, Base: c.Base.Commit, Target: c.Target.Commit, Folder: c.Folder, Dataset: c.Dataset,
		RulesVersion: c.RulesVersion,
	}
	for _, q := range c.Requests {
		r.Requests = append(r.Requests, ledger.Request{ID: q.ID, Title: q.Title})
	}
	for _, p := range c.Preparers {
		r.Preparers = append(r.Preparers, ledger.Person{Name: p.Name, Email: p.Email})
	}
	for _, f := range c.Findings {
		r.Findings = append(r.Findings, ledger.Finding{ID: f.ID, Route: f.Route, Direction: f.Direction, From: f.From, To: f.To, Text: f.Text, Accepted: f.Accepted})
	}
	texts := map[*Route][]string{}
	for i := range c.Routes {
		list := make([]string, len(c.Routes[i].Sources))
		for k, s := range c.Routes[i].Sources {
			list[k] = SourceText(s)
		}
		texts[&c.Routes[i]] = list
	}
	r.Changes = func(yield func(ledger.Change) bool) {
		for row := range c.Rows() {
			x := row.Change
			sources := texts[row.Route]
			if !yield(ledger.Change{
				Route: row.Route.ID, Direction: x.Direction, Train: row.Train, From: x.From, To: x.To, LengthMM: x.Length,
				Before: x.Before, After: x.After, RunOut: x.RunOut, BeforeSource: sources[x.BeforeSource], AfterSource: sources[x.AfterSource],
			}) {
				return
			}
		}
	}
	return r
}
