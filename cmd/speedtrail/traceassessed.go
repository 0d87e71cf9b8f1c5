package main

import (
	"context"
	"errors"
	"os"
	"slices"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/history/approval"
	"speedtrail/history/ledger"
	"speedtrail/history/revision"
	"speedtrail/history/trace"
)

// assessments gives a function that lists the recorded assessments whose range
// base..target holds a commit, the oldest first, and the entry that anchors it.
func (t *tracing) assessments(ctx context.Context) (func(int32) ([]render.TraceAssessment, traceAnchor, error), error) {
	none := func(int32) ([]render.TraceAssessment, traceAnchor, error) {
		return []render.TraceAssessment{}, noAnchor, nil
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
	t.targets = map[int64]int32{}
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
		if r != nil && !r.beyond {
			t.targets[r.number] = r.target
		}
	}
	root := line.Anchor(t.folder)
	within := t.leadsTo(ctx, root)
	return func(c int32) (list []render.TraceAssessment, anchor traceAnchor, err error) {
		list, anchor = []render.TraceAssessment{}, noAnchor
		in, err := within(c)
		if err != nil {
			return nil, noAnchor, err
		}
		if in {
			anchor = traceAnchor{signOffs: anchoredBy(line, root), revoked: revokedOf(line, root.Records)}
			if root.Revision == t.h.Commits[c].Hash.String() {
				anchor.entry = root.Entry.String()
			} else {
				anchor.within = root.Entry.String()
			}
		}
		if len(ranges) == 0 {
			return list, anchor, nil
		}
		after := t.h.Descendants(c)
		for _, r := range ranges {
			if r.holds(t.h.Commits[c].Hash, after) {
				list = append(list, render.TraceAssessment{Beyond: r.beyond, Number: r.number, State: line.State(r.number).Word, SignOffs: signedBy(line, r.number), Revoked: revokedOf(line, decisionsOn(line.State(r.number), r.number))})
			}
		}
		return list, anchor, nil
	}, nil
}

// leadsTo gives a function that tells of a commit whether an anchored revision is it,
// or descends from it.
func (t *tracing) leadsTo(ctx context.Context, root *approval.AnchorRecord) func(int32) (bool, error) {
	none := func(int32) (bool, error) { return false, nil }
	if root == nil {
		return none
	}
	hash, err := trace.ParseHash(root.Revision)
	if err != nil {
		return none
	}
	if at, ok := t.h.Index(hash); ok {
		if slices.Contains(t.view.Order(), at) {
			t.anchored = &at
		}
		before := t.h.Ancestors(at)
		return func(c int32) (bool, error) { return before[c], nil }
	}
	// The history that is traced ends before the anchor, or leaves side branches out.
	return func(c int32) (bool, error) {
		is, err := t.repo.IsAncestor(ctx, t.h.Commits[c].Hash.String(), root.Revision)
		if errors.Is(err, revision.ErrMissingObject) || errors.Is(err, revision.ErrUnknown) || errors.Is(err, revision.ErrShallow) {
			return false, nil // it cannot be told
		}
		return is, err
	}
}

// traceAnchor is what a trace says of an anchor.
type traceAnchor struct {
	entry, within string // SEQ:HASH, empty: none
	signOffs      []string
	revoked       []render.RevokedSignOff
}

var noAnchor = traceAnchor{signOffs: []string{}, revoked: []render.RevokedSignOff{}}

// anchoredBy lists who signed an anchor, in which role.
func anchoredBy(line *approval.Line, a *approval.AnchorRecord) []string {
	list := []string{}
	for _, r := range a.Records {
		list = append(list, r.Role+" "+r.Signer+elsewhereBehind(line, r))
	}
	return list
}

// assessedRange is the commits that an assessment covers: those that its target
// reaches and its base does not.
type assessedRange struct {
	number       int64
	base, target int32               // in the history, where both are
	listed       map[trace.Hash]bool // else
	beyond       bool                // the target is not in the history that is traced
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
	r.beyond = !known[1] || !slices.Contains(t.view.Order(), r.target)
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
