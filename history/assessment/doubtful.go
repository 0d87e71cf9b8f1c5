package assessment

import (
	"time"

	"speedtrail/diff"
	"speedtrail/diff/doubt"
	"speedtrail/schema"
	"speedtrail/schema/parallel"
)

// Doubtful is what one revision of a data set holds of doubtful data: what obeys the
// rules and should be looked at all the same. An assessment has that of the routes
// that differ, a Doubtful that of all.
type Doubtful struct {
	Accepted  []Acceptance  `json:"accepted"`  // the entries of accepted.toml
	At        string        `json:"at"`        // the time that validities are compared with, RFC 3339
	Explained []Explanation `json:"explained"` // the kinds of finding that occur, in their order
	Findings  []Finding     `json:"findings"`  // in the order in which to look at them
	Unchecked []string      `json:"unchecked"` // what was not looked for, for want of a limit in dataset.toml
}

// DoubtfulData looks for doubtful data on every route of a data set. at is the time
// that validities and the terms of acceptances are compared with: the committer date of
// the revision, for the working tree the present. The same input gives the same result.
func DoubtfulData(d *schema.Dataset, at time.Time) *Doubtful {
	account := &diff.Account{Routes: make([]diff.Route, len(d.Routes))}
	for i, r := range d.Routes {
		account.Routes[i] = diff.Route{ID: r.ID, Base: r, Target: r}
	}
	in := &Input{Base: d, Target: d, Account: account, At: at}
	perRoute := make([]collector, len(d.Routes))
	parallel.Each(len(perRoute), func(i int) {
		perRoute[i] = collector{in: in}
		perRoute[i].doubtful(d.Routes[i], d, nil)
	})
	c := collector{in: in}
	for i := range perRoute {
		c.list = append(c.list, perRoute[i].list...)
	}
	c.joinDirections()
	out := &Doubtful{Accepted: c.accept(), At: at.UTC().Format(time.RFC3339), Unchecked: doubt.Unchecked(d.Limits)}
	out.Findings = c.inOrder()
	out.Explained = explanations(out.Findings)
	return out
}

// Open counts the findings that nobody has accepted.
func (d *Doubtful) Open() (n int) {
	for _, f := range d.Findings {
		if f.Accepted == "" {
			n++
		}
	}
	return n
}
