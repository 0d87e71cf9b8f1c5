package main

import (
	"context"
	"errors"
	"io/fs"
	"slices"

	"speedtrail/diff"
	"speedtrail/history"
	"speedtrail/history/assessment"
	"speedtrail/history/revision"
)

// checker re-derives from Git what the ledger says. It opens the repository anew
// for each call, so that calls can run side by side.
type checker struct{ a *app }

// Recompute computes an assessment anew and gives its digest.
func (c *checker) Recompute(ctx context.Context, doc *assessment.Document) (string, error) {
	repo, err := c.a.openRepo()
	if err != nil {
		return "", err
	}
	defer repo.Close()
	return c.recompute(ctx, repo, doc)
}

func (c *checker) recompute(ctx context.Context, repo *revision.Repo, doc *assessment.Document) (string, error) {
	d := &doc.Computed
	if d.RulesVersion != diff.RulesVersion {
		return "", history.ErrOtherRules
	}
	for _, side := range []struct{ name, commit string }{{"base", d.Base.Commit}, {"target", d.Target.Commit}} {
		if err := lacks(repo, side.name, side.commit); err != nil {
			return "", err
		}
	}
	// A call of its own: its folder is that of the assessment, and it shows no
	// progress.
	one := &app{in: c.a.in, out: c.a.out, err: c.a.err, repo: c.a.repo, data: d.Folder, quiet: true}
	options := d.Options
	options.Requests = slices.Clone(options.Requests)
	asRecorded := func(assessment.Revision, string, string) (string, error) { return d.PreparedSince, nil }
	again, err := one.compute(ctx, repo, comparison{base: d.Base.Commit, target: d.Target.Commit, Options: options, whole: true, since: asRecorded})
	if err != nil {
		return "", err
	}
	_, digest, err := again.Encode()
	return digest, err
}

// Content gives what a folder holds at a commit.
func (c *checker) Content(_ context.Context, commit, folder string) (history.Content, error) {
	repo, err := c.a.openRepo()
	if err != nil {
		return history.Content{}, err
	}
	defer repo.Close()
	found, err := contentAt(repo, commit, folder)
	if err != nil {
		err = lackingToo(err, lacks(repo, "revision", commit))
	}
	return found, err
}

// lackingToo adds to an error that it comes of a commit that the repository does not
// have, where it does.
func lackingToo(err, lacking error) error {
	var lacks *history.LackingError
	if !errors.As(lacking, &lacks) {
		return err
	}
	return &bothErrors{err, lacks}
}

// bothErrors reads as the first one, and is the second one as well.
type bothErrors struct {
	error
	too error
}

// Unwrap gives both.
func (e *bothErrors) Unwrap() []error { return []error{e.error, e.too} }

// contentAt gives what a folder holds at a commit of a repository.
func contentAt(repo *revision.Repo, commit, folder string) (history.Content, error) {
	files, err := repo.Snapshot(commit, folder)
	if err != nil {
		return history.Content{}, err
	}
	read := func(name string) string {
		content, readErr := fs.ReadFile(files, name)
		if readErr != nil && !isNotExist(readErr) {
			err = readErr
		}
		return string(content)
	}
	found := history.Content{Tree: content(files), SignOff: read("signoff.toml"), AllowedSigners: read("allowed_signers")}
	return found, err
}

func isNotExist(err error) bool { return errors.Is(err, fs.ErrNotExist) }

// lacks gives an error of its own for a commit that the repository does not have: what
// is there and cannot be read is another matter.
func lacks(repo *revision.Repo, side, commit string) error {
	_, err := repo.Resolve(commit)
	if !errors.Is(err, revision.ErrUnknown) {
		return err
	}
	todo := repo.Lacking()
	if todo == "" {
		todo = "fetch the branch or tag that holds it; a commit that was amended, rebased or squashed away is for a while in the clone where it was made: `git tag NAME COMMIT` there, and push the tag"
	}
	return &history.LackingError{Side: side, Commit: commit, Todo: todo}
}
