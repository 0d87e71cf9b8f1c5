package main

import (
	"context"
	"errors"
	"os"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/history/approval"
	"speedtrail/history/ledger"
	"speedtrail/history/revision"
	"speedtrail/history/trace"
)

// assessments gives a function that lists the recorded assessments whose range
// base..target holds a commit, the oldest first, and the entry that anchors it.
func (t *tracing) assessments(ctx context.Context) (func(int32) ([]render.TraceAssessment, traceAnchor), error) {
	none := func(int32) ([]render.TraceAssessment, traceAnchor) {
		return []render.TraceAssessment{}, noAnchor
	}
	l, err := t.app.openLedger(ctx, false)
	if errors.Is(err, ledger.ErrNoLedger) || errors.Is(err, os.ErrNotExist) {
		return none, nil
	}
	if err != nil {
		return nil, err
	}
	defer l.Close()
	rows, err := l.Assessments(ctx)
	if err != nil {
		return nil, err
	}
	line, err := t.app.readLine(ctx, l)
	if err != nil {
		return nil, err
	}
	var ranges []*assessedRange
	for i := len(rows) - 1; i >= 0; i-- {
		if rows[i].Folder != t.folder {
			continue
		}
		r, err := t.rangeOf(ctx, rows[i])
		if err != nil {
			return nil, err
		}
		if r != nil {
			ranges = append(ranges, r)
		}
	}
	return func(c int32) (list []render.TraceAssessment, anchor traceAnchor) {
		list, anchor = []render.TraceAssessment{}, noAnchor
		if a := line.Anchor(t.folder); a != nil && a.Revision == t.h.Commits[c].Hash.String() {
			anchor = traceAnchor{a.Entry.String(), anchoredBy(a), revokedOf(line, a.Records)}
		}
		if len(ranges) == 0 {
			return list, anchor
		}
		after := t.h.Descendants(c)
		for _, r := range ranges {
			if r.holds(t.h.Commits[c].Hash, after) {
				list = append(list, render.TraceAssessment{Number: r.number, State: line.State(r.number).Word, SignOffs: signedBy(line, r.number), Revoked: revokedOf(line, line.State(r.number).Signed)})
			}
		}
		return list, anchor
	}, nil
}

// traceAnchor is what a trace says of an anchor.
type traceAnchor struct {
	entry    string // SEQ:HASH, empty: none
	signOffs []string
	revoked  []render.RevokedSignOff
}

var noAnchor = traceAnchor{signOffs: []string{}, revoked: []render.RevokedSignOff{}}

// anchoredBy lists who signed an anchor, in which role.
func anchoredBy(a *approval.AnchorRecord) []string {
	list := []string{}
	for _, r := range a.Records {
		list = append(list, r.Role+" "+r.Signer)
	}
	return list
}

// assessedRange is the commits that an assessment covers: those that its target
// reaches and its base does not.
type assessedRange struct {
	number       int64
	base, target int32               // in the history, where both are
	listed       map[trace.Hash]bool // else
}

func (r *assessedRange) holds(h trace.Hash, after []bool) bool {
	if r.listed != nil {
		return r.listed[h]
	}
	return after[r.target] && !after[r.base]
}

// rangeOf finds the commits of an assessment; nil where this repository does not
// have them.
func (t *tracing) rangeOf(ctx context.Context, row ledger.AssessmentRow) (*assessedRange, error) {
	r := &assessedRange{number: row.Number}
	base, err := trace.ParseHash(row.Base)
	if err != nil {
		return nil, nil // the working tree has no hash, and is never recorded
	}
	target, err := trace.ParseHash(row.Target)
	if err != nil {
		return nil, nil
	}
	var known [2]bool
	r.base, known[0] = t.h.Index(base)
	r.target, known[1] = t.h.Index(target)
	if known[0] && known[1] {
		return r, nil
	}
	commits, _, err := t.repo.Between(ctx, row.Base, row.Target)
	if errors.Is(err, revision.ErrMissingObject) || errors.Is(err, revision.ErrUnknown) {
		return nil, nil
	}
	if err != nil {
		return nil, err
	}
	r.listed = map[trace.Hash]bool{}
	for _, c := range commits {
		h, err := trace.ParseHash(c.Hash)
		if err != nil {
			return nil, err
		}
		r.listed[h] = true
	}
	return r, nil
}
