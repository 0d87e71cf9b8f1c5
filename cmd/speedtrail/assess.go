package main

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"slices"
	"time"

	"github.com/spf13/cobra"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/diff"
	"speedtrail/history"
	"speedtrail/history/approval"
	"speedtrail/history/assessment"
	"speedtrail/history/ledger"
	"speedtrail/history/revision"
	"speedtrail/schema"
	"speedtrail/schema/source"
)

func (a *app) assessCommand() *cobra.Command {
	var noRecord, rolling bool
	var requests []string
	c := &cobra.Command{
		Use:   "assess BASE [TARGET]",
		Short: "compare two revisions: who is faster or slower, where and why",
		Long: `assess compiles the effective speed profile of every reference train at two
revisions, lists where they differ with the rows behind it, records the result
in the ledger and prints it.

A revision is anything that Git resolves to a commit: a branch, a tag, a hash,
HEAD~2. TARGET is the working tree (".") unless given: the files on disk, those
that Git ignores left out. The working tree is never recorded.

Every change has to be declared by a change request (requests/*.toml): those
that were added or altered between the revisions count, or those named with
--request. "--request none" leaves that comparison out.

Exit status 1 for any finding that is not accepted, one that the base has too
included. In a shallow clone, as pipelines make them, use --no-record.`,
		Example: `  speedtrail assess release-1 release-2
  speedtrail assess HEAD
  speedtrail assess --no-record --format csv main HEAD`,
		Args: arguments(1, 2),
		RunE: func(c *cobra.Command, args []string) error {
			target := workingTree
			if len(args) == 2 {
				target = args[1]
			}
			options := assessment.Options{Requests: []string{}, Rolling: rolling}
			for _, id := range requests {
				if id == "none" {
					options.NoRequests = true
					continue
				}
				options.Requests = append(options.Requests, id)
			}
			if options.NoRequests && len(options.Requests) > 0 {
				return badCall("--request none stands alone", "--request none and another request are both given")
			}
			slices.Sort(options.Requests)
			options.Requests = slices.Compact(options.Requests)
			return a.assess(c.Context(), args[0], target, options, !noRecord)
		},
	}
	a.outputFlags(c, "text", "html", "markdown", "csv", "json")
	c.Flags().BoolVar(&noRecord, "no-record", false, "do not write to the ledger, for pipelines")
	c.Flags().StringArrayVar(&requests, "request", nil, "the change request `ID` that declares the change (repeatable), or none")
	c.Flags().BoolVar(&rolling, "rolling", false, "running times begin and end at speed, not at rest")
	return c
}

func (a *app) assess(ctx context.Context, base, target string, options assessment.Options, record bool) error {
	repo, err := a.openRepo()
	if err != nil {
		return err
	}
	defer repo.Close()
	record = record && base != workingTree && target != workingTree
	var into recording
	defer into.close()
	since := fromBase
	if record {
		since = func(base assessment.Revision, target, folder string) (string, error) {
			if err := into.open(ctx, a); err != nil {
				return "", err
			}
			return a.approvedCommit(ctx, repo, into.line, base, target, folder)
		}
	}
	doc, err := a.compute(ctx, repo, comparison{base: base, target: target, Options: options, whole: record, since: since})
	if err != nil {
		return err
	}
	var rec render.Record
	if record {
		if rec, err = a.record(ctx, doc, &into); err != nil {
			return err
		}
	}
	if err := a.render(doc, rec); err != nil {
		return err
	}
	a.summarise(doc, rec)
	return verdictOf(doc)
}

// errShallow says that the clone does not hold all commits between two revisions.
var errShallow = &callError{"the clone is shallow and its history ends between base and target: who prepared the change cannot be known, nor perhaps whether the base came before", "git fetch --unshallow brings the rest; --no-record assesses without it"}

// comparison is what is asked of two revisions.
type comparison struct {
	base, target string // as they were typed
	assessment.Options
	// whole: the whole history between them is needed, since the result is recorded, or
	// held against what is.
	whole bool
	since counting
}

// compute makes the document of two revisions.
func (a *app) compute(ctx context.Context, repo *revision.Repo, c comparison) (*assessment.Document, error) {
	folder, err := a.folder()
	if err != nil {
		return nil, err
	}
	from, err := a.openSide(repo, c.base)
	if err != nil {
		return nil, err
	}
	to, err := a.openSide(repo, c.target)
	if err != nil {
		return nil, err
	}
	before, after, err := schema.LoadPair(ctx, from.files, to.files)
	if err != nil {
		return nil, inSides(err, from, to)
	}
	account, err := diff.Compare(ctx, before, after, diff.Options{
		Requests: c.Requests, NoRequests: c.NoRequests, Rolling: c.Rolling,
		Unread: unread(to.files, after.Unread), Progress: a.progress("comparing routes"),
	})
	var unknown *diff.UnknownRequestError
	var faults *source.Faults
	switch {
	case errors.As(err, &unknown):
		return nil, badCall(meant(unknown.ID, unknown.Known, "the requests of a revision stand in its folder requests/: "+cmp.Or(some(unknown.Known), "none")), "%v", err)
	case errors.As(err, &faults):
		return nil, &requestError{to.label(), err}
	case errors.Is(err, diff.ErrTooMany):
		return nil, badCall("compare in steps, or with fewer reference trains", "%v", err)
	case err != nil:
		return nil, err
	}
	in := assessment.Input{
		Base: before, Target: after, Account: account, Folder: folder,
		BaseRev: from.revisionOf(), TargetRev: to.revisionOf(),
		Named:     assessment.Named{Base: validText(from.typed), BaseName: validText(from.name), Target: validText(to.typed), TargetName: validText(to.name)},
		Preparers: []assessment.Person{}, Options: c.Options, BaseIsAncestor: true,
	}
	if in.At, err = to.time(); err != nil {
		return nil, err
	}
	complete, err := a.descent(ctx, repo, from, to, c.since, &in)
	if err != nil {
		return nil, err
	}
	if !complete && c.whole {
		return nil, errShallow
	}
	if !complete {
		a.remark("! %v", errShallow.problem)
	}
	return assessment.Build(in), nil
}

// descent fills in what the history between the revisions says. It is not complete
// where a shallow clone ends between them.
func (a *app) descent(ctx context.Context, repo *revision.Repo, from, to side, since counting, in *assessment.Input) (complete bool, err error) {
	if from.isWorkingTree() {
		return true, nil
	}
	if to.isWorkingTree() {
		head, err := repo.Resolve("HEAD")
		if err != nil {
			return false, err
		}
		in.BaseIsAncestor, complete, err = ancestor(ctx, repo, from, head)
		return complete, err
	}
	known := true
	if in.BaseIsAncestor, known, err = ancestor(ctx, repo, from, to.commit); err != nil {
		return false, err
	}
	if !in.BaseIsAncestor {
		if in.TargetIsAncestor, err = repo.IsAncestor(ctx, to.commit.Hash, from.commit.Hash); err != nil {
			return false, err
		}
	}
	if in.PreparedSince, err = since(in.BaseRev, to.commit.Hash, in.Folder); err != nil {
		return false, err
	}
	commits, complete, err := repo.Between(ctx, cmp.Or(in.PreparedSince, from.commit.Hash), to.commit.Hash)
	if err != nil {
		return false, err
	}
	if in.PreparedSince != "" {
		if commits, err = withoutCopies(repo, commits, in.BaseRev.Tree, in.Folder); err != nil {
			return false, err
		}
	}
	for _, p := range repo.Preparers(commits) {
		in.Preparers = append(in.Preparers, assessment.Person{Name: validText(p.Name), Email: validText(p.Email)})
	}
	return complete && known, nil
}

// ancestor tells whether base came before target. Where a shallow clone ends before
// that can be seen it is not known, and taken to be so: it is no finding against
// the change.
func ancestor(ctx context.Context, repo *revision.Repo, base side, target revision.Commit) (is, known bool, err error) {
	is, err = repo.IsAncestor(ctx, base.commit.Hash, target.Hash)
	if errors.Is(err, revision.ErrShallow) {
		return true, false, nil
	}
	return is, true, err
}

// unread finds routes among the folders that were left unread, all of which are
// looked at when the first is asked for.
func unread(files fs.FS, folders []schema.Folder) func(string) (*schema.Route, error) {
	var byID map[string]*schema.Route
	return func(id string) (*schema.Route, error) {
		if byID == nil {
			byID = map[string]*schema.Route{}
			for _, f := range folders {
				r, err := schema.UnreadRoute(files, f)
				if err != nil {
					return nil, err
				}
				byID[r.ID] = r
			}
		}
		return byID[id], nil
	}
}

// record writes a document to the ledger.
func (a *app) record(ctx context.Context, doc *assessment.Document, into *recording) (render.Record, error) {
	// A call that is refused makes no ledger.
	body, digest, err := doc.Encode()
	if err != nil {
		return render.Record{}, err
	}
	if err := history.CheckBody(body); err != nil {
		return render.Record{}, badCall("assess with fewer reference trains, or the change in steps; --no-record shows the result", "the assessment is too large to be recorded: %v", err)
	}
	if err := into.make(ctx, a); err != nil {
		return render.Record{}, err
	}
	l, line := into.ledger, into.line
	if err := needPolicies(line, &doc.Computed); err != nil {
		return render.Record{}, err
	}
	in, err := l.RecordAssessment(ctx, time.Now(), assessment.LedgerRecord(doc, body, digest))
	if err != nil {
		return render.Record{}, fmt.Errorf("the assessment was not recorded: %w", err)
	}
	if in.Added {
		a.remark("recorded as assessment %d; head of the ledger %s (note it elsewhere: it proves later that nothing was removed)", in.Number, in.Head)
	} else {
		a.remark("assessment %d holds this result already, nothing was added; head of the ledger %s", in.Number, in.Head)
	}
	if _, err := history.ReadOn(ctx, l, line); err != nil {
		return render.Record{}, err
	}
	if x := line.Assessment(in.Number); x == nil || x.Digest != digest {
		return render.Record{}, ledger.Damaged(fmt.Errorf("assessment %d, which is said to hold this result, holds another", in.Number))
	}
	return recordOf(line, l.ID(), in.Number, digest), nil
}

// needPolicies refuses, once a policy is anchored for the folder, a revision
// without one: from then on a change must be one that can be signed.
func needPolicies(line *approval.Line, c *assessment.Computed) error {
	if line.Anchor(c.Folder) == nil {
		return nil
	}
	for _, side := range []struct {
		name   string
		policy assessment.Policy
	}{{"base", c.Policy.Base}, {"target", c.Policy.Target}} {
		if side.policy == (assessment.Policy{}) {
			return badCall("restore signoff.toml and allowed_signers; --no-record assesses without recording", "the %s has no policy, and one is anchored in the ledger for the folder %s", side.name, c.Folder)
		}
	}
	return nil
}

// render writes a document in the chosen format.
func (a *app) render(doc *assessment.Document, rec render.Record) error {
	return a.write(func(w io.Writer) error {
		switch a.format {
		case "html":
			return render.HTML(w, doc, rec)
		case "markdown":
			return render.Markdown(w, doc, rec)
		case "csv":
			return render.CSV(w, doc)
		case "json":
			return render.JSON(w, doc, rec)
		}
		return render.Text(w, doc, rec, a.style())
	})
}

// summarise says beside a result that goes to a file or a program what decides,
// and what its format does not carry.
func (a *app) summarise(doc *assessment.Document, rec render.Record) {
	if a.format == "text" && a.outTo == "" {
		return
	}
	a.remark("%s", render.Verdict(doc))
	for _, r := range doc.Computed.Routes {
		for _, t := range r.Track {
			a.remark("track %s: %s %s, km %s to %s", t.Fate, r.ID, t.Direction, t.From, t.To)
		}
	}
	a.remarkHidden(doc)
	if a.outTo != "" {
		a.remark("written to %s", a.outTo)
	} else if rec.Number != 0 {
		a.remark("%s", a.advise(fmt.Sprintf("next: speedtrail report %d --out report.html", rec.Number)))
	}
}

// remarkHidden says what the rows of CSV, which are the changes of today, leave out.
func (a *app) remarkHidden(doc *assessment.Document) {
	if a.format != "csv" {
		return
	}
	n, track := 0, 0
	for i := range doc.Computed.Routes {
		track += len(doc.Computed.Routes[i].Track)
		for _, c := range doc.Computed.Routes[i].Masked {
			n += len(c.Trains)
		}
	}
	if track > 0 {
		a.remark("! stretches of track that only one revision has, and that CSV does not hold: %d; the other formats have them", track)
	}
	if n > 0 {
		a.remark("! changes that temporary restrictions hide today, and that CSV does not hold: %d (a train and stretch each); the other formats have them", n)
	}
}

// verdictOf gives the error for the exit status: a finding that nobody has
// accepted counts against the change.
func verdictOf(doc *assessment.Document) error {
	for _, f := range doc.Computed.Findings {
		if f.Accepted == "" {
			return errFindings
		}
	}
	return nil
}
