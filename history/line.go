// Package history joins what the ledger records, what people signed and what Git
// holds: the state of every assessment, what was in force when, and the proof
// that nothing was altered.
//
//	line, problems, err := history.ReadLine(ctx, ledger)
//	line.State(3).Word // "approved"
package history

import (
	"context"
	"fmt"
	"slices"
	"strings"

	"speedtrail/history/approval"
	"speedtrail/history/assessment"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
	"speedtrail/history/signoff"
)

// ReadLine follows the line of approval through a ledger. problems are the
// entries that do not count, with the reason; they do not stop the reading. An
// entry that does not follow in the chain, and an assessment whose row does not
// repeat it, are errors of class ledger.ErrDamaged.
func ReadLine(ctx context.Context, l *ledger.Ledger) (line *approval.Line, problems []error, err error) {
	line = approval.New(l.ID())
	problems, err = ReadOn(ctx, l, line)
	if err != nil {
		return nil, nil, err
	}
	return line, problems, nil
}

// ReadOn follows a line through the entries that came after those it knows. An
// entry that does not follow in the chain is an error of class ledger.ErrDamaged.
func ReadOn(ctx context.Context, l *ledger.Ledger, line *approval.Line) (problems []error, err error) {
	for e, err := range openAhead(ctx, l, line.Head(), false) {
		if err != nil {
			return nil, err
		}
		// Nobody is shown, and nobody signs, what is not what was recorded.
		if e.broken != nil {
			return nil, ledger.Damaged(e.broken)
		}
		var a *approval.Assessment
		if e.Kind == chain.Assessment {
			row, err := l.AssessmentOf(ctx, e.Seq)
			if err != nil {
				return nil, err
			}
			if number := line.Numbered() + 1; row.Number != number {
				return nil, ledger.Damaged(fmt.Errorf("the assessment of entry %d has the number %d, by its place it is %d", e.Seq, row.Number, number))
			}
			if e.unreadable == nil {
				if err := repeats(row, e); err != nil {
					return nil, ledger.Damaged(err)
				}
				a = assessmentOf(line, row.Number, e.digest, e.doc)
			}
		}
		if err := line.Add(e.Entry, a); err != nil {
			problems = append(problems, fmt.Errorf("entry %d (%s): %w", e.Seq, e.Kind, err))
		}
	}
	rows, orphans, err := l.RowCount(ctx, "assessment", line.Head().Seq)
	if err == nil && rows+orphans != line.Numbered() {
		err = ledger.Damaged(fmt.Errorf("table assessment has %d rows, the entries ask for %d", rows+orphans, line.Numbered()))
	}
	return problems, err
}

// repeats checks that the row of an assessment, which lists are made of, says what
// its entry says.
func repeats(row ledger.AssessmentRow, e *opened) error {
	c := &e.doc.Computed
	changes := int64(0)
	for i := range c.Routes {
		for k := range c.Routes[i].Changes {
			changes += int64(len(c.Routes[i].Changes[k].Trains))
		}
	}
	requests := make([]string, len(c.Requests))
	for i := range requests {
		requests[i] = c.Requests[i].ID
	}
	if !slices.Equal(row.Requests, requests) {
		return fmt.Errorf("the rows of assessment %d have the requests %s, its entry says %s", row.Number, listed(row.Requests), listed(requests))
	}
	for _, x := range []struct {
		name       string
		have, want any
	}{
		{"digest", row.Digest, e.digest}, {"base", row.Base, c.Base.Commit}, {"target", row.Target, c.Target.Commit}, {"folder", row.Folder, c.Folder},
		{"dataset", row.Dataset, c.Dataset}, {"speed_changes", row.Changes, changes}, {"findings", row.Findings, int64(len(c.Findings))},
	} {
		if x.have != x.want {
			return fmt.Errorf("the row of assessment %d has the %s %v, its entry says %v", row.Number, x.name, x.have, x.want)
		}
	}
	return nil
}

func listed(names []string) string {
	if len(names) == 0 {
		return "none"
	}
	return strings.Join(names, ", ")
}

// assessmentOf gives what the line of approval needs of an assessment.
func assessmentOf(line *approval.Line, number int64, digest string, doc *assessment.Document) *approval.Assessment {
	c := &doc.Computed
	a := &approval.Assessment{
		Number: number, Digest: digest, Base: c.Base.Commit, Target: c.Target.Commit, BaseTree: c.Base.Tree, TargetTree: c.Target.Tree,
		Folder: c.Folder, Rules: c.RulesVersion, Findings: statedFindings(c), Since: c.PreparedSince,
		Policy: line.Policy(c.Policy.Base.SignOff, c.Policy.Base.AllowedSigners),
		Next:   line.Policy(c.Policy.Target.SignOff, c.Policy.Target.AllowedSigners),
	}
	for _, p := range c.Preparers {
		a.Preparers = append(a.Preparers, p.Email)
	}
	for _, f := range c.Findings {
		a.BaseNotAncestor = a.BaseNotAncestor || f.ID == assessment.BaseNotAncestor
	}
	return a
}

// statedFindings lists the findings that nobody has accepted as statements write them:
// each id with its number, in the order of the assessment; "none" for none. Before
// them it says that nobody compared the change with requests, where that is so: who
// signs then signs for that as well. Statements over assessments of before version 4
// of the rules did not.
func statedFindings(c *assessment.Computed) string {
	var ids []string
	count := map[string]int{}
	for _, f := range c.Findings {
		if f.Accepted != "" {
			continue
		}
		if count[f.ID] == 0 {
			ids = append(ids, f.ID)
		}
		count[f.ID]++
	}
	for i, id := range ids {
		ids[i] = fmt.Sprintf("%s %d", id, count[id])
	}
	if c.Options.NoRequests && c.RulesVersion >= 4 {
		ids = slices.Insert(ids, 0, "requests not looked at")
	}
	if ids == nil {
		return "none"
	}
	return strings.Join(ids, ", ")
}

// rowsOf gives the rows that repeat a checked statement.
func rowsOf(kind chain.Kind, r *approval.Record) []ledger.Row {
	at := r.Time.UTC().Format(signoff.TimeLayout)
	hash := signoff.Hash(r.Text)
	switch kind {
	case chain.SignOff:
		return []ledger.Row{{Table: ledger.SignOffTable, Values: []any{r.Assessment, r.Digest, r.Role, r.Decision, r.Reason, r.Signer, r.Fingerprint, at, hash}}}
	case chain.InForce:
		routes := signoff.AllRoutes
		if len(r.Routes) > 0 {
			routes = strings.Join(r.Routes, ",")
		}
		return []ledger.Row{{Table: ledger.InForceTable, Values: []any{r.Folder, r.Revision, r.Content, routes, r.Since.UTC().Format(signoff.TimeLayout), r.Corrects, r.Reason, r.Signer, r.Fingerprint, at, hash}}}
	case chain.Revocation:
		return []ledger.Row{{Table: ledger.RevocationTable, Values: []any{r.Key, r.Role, r.Reason, r.Signer, r.Fingerprint, at, hash}}}
	}
	return nil
}

// anchorRows gives the rows that repeat an anchor.
func anchorRows(a *approval.AnchorRecord) []ledger.Row {
	var rows []ledger.Row
	for i, r := range a.Records {
		rows = append(rows, ledger.Row{Table: ledger.AnchorTable, Values: []any{
			int64(i + 1), r.Folder, r.Revision, r.Content, r.Policy, r.Role, r.Signer, r.Fingerprint, r.Time.UTC().Format(signoff.TimeLayout), signoff.Hash(r.Text),
		}})
	}
	return rows
}
