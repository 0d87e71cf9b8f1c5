package assessment

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"iter"

	"speedtrail/history/canon"
	"speedtrail/history/ledger"
)

// Encode writes the document as canonical JSON and gives its digest. The members
// of every type stand in the canonical order already.
func (d *Document) Encode() (body []byte, digest string, err error) {
	var b bytes.Buffer
	b.WriteString(`{"computed":`)
	start := b.Len()
	if err := canon.AppendOrdered(&b, &d.Computed); err != nil {
		return nil, "", err
	}
	sum := sha256.New()
	sum.Write([]byte(Format + "\n"))
	sum.Write(b.Bytes()[start:])
	b.WriteString(`,"format":"` + Format + `","named":`)
	if err := canon.AppendOrdered(&b, &d.Named); err != nil {
		return nil, "", err
	}
	b.WriteByte('}')
	return b.Bytes(), hex.EncodeToString(sum.Sum(nil)), nil
}

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
		for i := range c.Routes {
			route := &c.Routes[i]
			changes := route.Changes
			// Changes that begin at one place are told apart by their trains.
			for len(changes) > 0 {
				n := 1
				for n < len(changes) && changes[n].Direction == changes[0].Direction && changes[n].Start == changes[0].Start {
					n++
				}
				for _, row := range byTrain(route, changes[:n]) {
					row.Train = c.Trains[row.train].ID
					if !yield(row.Row) {
						return
					}
				}
				changes = changes[n:]
			}
		}
	}
}

type trainRow struct {
	Row
	train int
}

// byTrain lists changes of one place by train.
func byTrain(route *Route, changes []Change) []trainRow {
	var rows []trainRow
	next := make([]int, len(changes))
	for {
		least := -1
		for k := range changes {
			if next[k] < len(changes[k].Trains) && (least < 0 || changes[k].Trains[next[k]] < changes[least].Trains[next[least]]) {
				least = k
			}
		}
		if least < 0 {
			return rows
		}
		rows = append(rows, trainRow{Row{Route: route, Change: &changes[least]}, changes[least].Trains[next[least]]})
		next[least]++
	}
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
