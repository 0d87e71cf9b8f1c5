package assessment

import (
	"iter"

	"speedtrail/history/canon"
	"speedtrail/history/ledger"
)

// Decode reads a stored document.
func Decode(body []byte) (*Document, error) {
	d := new(Document)
	if err := canon.Unmarshal(body, d); err != nil {
		return nil, err
	}
	return d, nil
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
