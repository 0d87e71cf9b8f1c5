package main

import (
	"context"
	"fmt"
	"io"
	"time"

	"github.com/spf13/cobra"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/diff"
	"speedtrail/history/assessment"
	"speedtrail/history/revision"
	"speedtrail/schema"
)

func (a *app) assessCommand() *cobra.Command {
	var noRecord bool
	c := &cobra.Command{
		Use:   "assess BASE [TARGET]",
		Short: "compare two revisions: who is faster or slower, where, because of which row",
		Long: `assess compiles the effective speed profile of every reference train at two
revisions, lists where they differ with the rows behind it, records the result
in the ledger and prints it.

A revision is anything that Git resolves to a commit: a branch, a tag, a hash,
HEAD~2. TARGET is the working tree (".") unless given: the files on disk, those
that Git ignores left out. The working tree is never recorded.`,
		Example: `  speedtrail assess release-1 release-2
  speedtrail assess HEAD
  speedtrail assess --no-record --format csv main HEAD`,
		Args: arguments(1, 2),
		RunE: func(c *cobra.Command, args []string) error {
			target := workingTree
			if len(args) == 2 {
				target = args[1]
			}
			return a.assess(c.Context(), args[0], target, !noRecord)
		},
	}
	a.outputFlags(c, "text", "html", "markdown", "csv", "json")
	c.Flags().BoolVar(&noRecord, "no-record", false, "do not write to the ledger, for pipelines")
	return c
}

func (a *app) assess(ctx context.Context, base, target string, record bool) error {
	repo, err := a.openRepo()
	if err != nil {
		return err
	}
	defer repo.Close()
	doc, err := a.compute(ctx, repo, base, target)
	if err != nil {
		return err
	}
	var rec render.Record
	if record && target != workingTree {
		if rec, err = a.record(ctx, doc); err != nil {
			return err
		}
	}
	if err := a.render(doc, rec); err != nil {
		return err
	}
	a.summarise(doc, rec)
	return verdictOf(doc)
}

// compute makes the document of two revisions.
func (a *app) compute(ctx context.Context, repo *revision.Repo, base, target string) (*assessment.Document, error) {
	folder, err := a.folder()
	if err != nil {
		return nil, err
	}
	from, err := a.openSide(repo, base)
	if err != nil {
		return nil, err
	}
	to, err := a.openSide(repo, target)
	if err != nil {
		return nil, err
	}
	before, after, err := schema.LoadPair(ctx, from.files, to.files)
	if err != nil {
		return nil, inSides(err, from, to)
	}
	account, err := diff.Compare(ctx, before, after, diff.Options{Progress: a.progress("comparing routes")})
	if err != nil {
		return nil, err
	}
	in := assessment.Input{
		Base: before, Target: after, Account: account, Folder: folder,
		BaseRev: from.revisionOf(), TargetRev: to.revisionOf(),
		Named:     assessment.Named{Base: validText(from.typed), BaseName: validText(from.name), Target: validText(to.typed), TargetName: validText(to.name)},
		Preparers: []assessment.Person{}, Findings: []assessment.Finding{},
		Options: assessment.Options{Requests: []string{}},
	}
	if !from.isWorkingTree() && !to.isWorkingTree() {
		commits, _, err := repo.Between(ctx, from.commit.Hash, to.commit.Hash)
		if err != nil {
			return nil, err
		}
		for _, p := range repo.Preparers(commits) {
			in.Preparers = append(in.Preparers, assessment.Person{Name: validText(p.Name), Email: validText(p.Email)})
		}
	}
	return assessment.Build(in), nil
}

// record writes a document to the ledger.
func (a *app) record(ctx context.Context, doc *assessment.Document) (render.Record, error) {
	l, err := a.openLedger(ctx, true)
	if err != nil {
		return render.Record{}, err
	}
	defer l.Close()
	body, digest, err := doc.Encode()
	if err != nil {
		return render.Record{}, err
	}
	number, added, head, err := l.RecordAssessment(ctx, time.Now(), assessment.LedgerRecord(doc, body, digest))
	if err != nil {
		return render.Record{}, fmt.Errorf("the assessment was not recorded: %w", err)
	}
	if added {
		a.remark("recorded as assessment %d; head of the ledger %s (note it elsewhere: it proves later that nothing was removed)", number, head)
	} else {
		a.remark("assessment %d holds this result already, nothing was added; head of the ledger %s", number, head)
	}
	return render.Record{Ledger: l.ID(), Number: number, Digest: digest, State: stateOpen}, nil
}

// stateOpen is the state of an assessment that nobody has signed.
const stateOpen = "open"

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
	if a.outTo != "" {
		a.remark("written to %s", a.outTo)
	} else if rec.Number != 0 {
		a.remark("next: speedtrail report %d --out report.html", rec.Number)
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
