package main

import (
	"context"
	"errors"
	"slices"

	"speedtrail/history/approval"
	"speedtrail/history/assessment"
	"speedtrail/history/ledger"
	"speedtrail/history/revision"
)

// recording is the ledger that an assessment goes into, and what is written there.
type recording struct {
	ledger *ledger.Ledger
	line   *approval.Line // nil where there is no ledger so far
}

// open opens the ledger where there is one: a call that is refused makes none.
func (r *recording) open(ctx context.Context, a *app) error {
	l, err := a.openLedgerFor(ctx, true)
	if errors.Is(err, ledger.ErrNoLedger) {
		return nil
	}
	if err != nil {
		return err
	}
	r.ledger = l
	r.line, err = a.readLine(ctx, l)
	return err
}

// make opens the ledger, and makes it where there is none.
func (r *recording) make(ctx context.Context, a *app) (err error) {
	if r.ledger != nil {
		return nil
	}
	if r.ledger, err = a.openLedger(ctx, true); err != nil {
		return err
	}
	r.line, err = a.readLine(ctx, r.ledger)
	return err
}

func (r *recording) close() {
	if r.ledger != nil {
		r.ledger.Close()
	}
}

// counting gives the commit from which the preparers of a target are counted, empty
// for its base.
type counting func(base assessment.Revision, target, folder string) (string, error)

// fromBase counts preparers from the base.
func fromBase(assessment.Revision, string, string) (string, error) { return "", nil }

// approvedCommit gives the approved commit of the base's content, empty where the
// base is one, or where there is none: another commit of the same content can have
// more history, and with it people who prepared what the target takes up. One that
// the target descends from is taken before others, then the newest that the
// repository has.
func (a *app) approvedCommit(ctx context.Context, repo *revision.Repo, line *approval.Line, base assessment.Revision, target, folder string) (string, error) {
	if line == nil {
		return "", nil
	}
	commits := line.ApprovedCommits(folder, base.Tree)
	if slices.Contains(commits, base.Commit) {
		return "", nil
	}
	found := ""
	for _, c := range slices.Backward(commits) {
		if _, err := repo.Resolve(c); err != nil {
			if errors.Is(err, revision.ErrUnknown) || errors.Is(err, revision.ErrMissingObject) {
				continue
			}
			return "", err
		}
		before, err := repo.IsAncestor(ctx, c, target)
		if err != nil {
			return "", err
		}
		if before {
			return c, nil
		}
		if found == "" {
			found = c
		}
	}
	if found == "" && len(commits) > 0 {
		a.remark("! the base has the content of the approved commit %s, which this repository does not have: fetch it and assess again, else the assessment cannot be signed", commits[len(commits)-1])
	}
	return found, nil
}

// withoutCopies leaves out the commits that have the approved content on parents
// that were approved before, as a squashed branch is: they bring nothing that was
// not looked at.
func withoutCopies(repo *revision.Repo, commits []revision.Commit, tree, folder string) ([]revision.Commit, error) {
	since := map[string]bool{}
	for _, c := range commits {
		since[c.Hash] = true
	}
	var out []revision.Commit
	for _, c := range commits {
		if len(c.Parents) > 0 && !slices.ContainsFunc(c.Parents, func(p string) bool { return since[p] }) {
			files, err := repo.Snapshot(c.Hash, folder)
			// What has no folder, or a tree that is none, is no copy.
			if err != nil && !errors.Is(err, revision.ErrNoFolder) && !errors.Is(err, revision.ErrMalformed) {
				return nil, err
			}
			if err == nil && content(files) == tree {
				continue
			}
		}
		out = append(out, c)
	}
	return out, nil
}
