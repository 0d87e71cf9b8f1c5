package main

import (
	"context"
	"fmt"

	"github.com/spf13/cobra"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/history"
	"speedtrail/history/approval"
	"speedtrail/history/assessment"
	"speedtrail/history/ledger"
	"speedtrail/history/signoff"
	"speedtrail/schema/source"
)

func (a *app) reportCommand() *cobra.Command {
	c := &cobra.Command{
		Use:   "report ID",
		Short: "the change report of a recorded assessment",
		Long: `report writes the change report of an assessment from the ledger alone: the
same assessment gives the same bytes.`,
		Example: `  speedtrail report 3 --out change.html
  speedtrail report 3 --format csv`,
		Args: arguments(1, 1),
		RunE: func(c *cobra.Command, args []string) error {
			n, err := assessmentNumber(args[0])
			if err != nil {
				return err
			}
			return a.report(c.Context(), n)
		},
	}
	a.outputFlags(c, "text", "html", "markdown", "csv", "json")
	return c
}

func (a *app) report(ctx context.Context, number int64) error {
	l, err := a.openLedger(ctx, false)
	if err != nil {
		return err
	}
	defer l.Close()
	doc, rec, err := recorded(ctx, l, number)
	if err != nil {
		return err
	}
	if err := a.render(doc, rec); err != nil {
		return err
	}
	a.remarkHidden(doc)
	a.remarkFile()
	return nil
}

// remarkFile says where a result went that is not on the screen.
func (a *app) remarkFile() {
	if a.outTo != "" {
		a.remark("written to %s", source.Visible(a.outTo))
	}
}

// recorded reads an assessment back from the ledger.
func recorded(ctx context.Context, l *ledger.Ledger, number int64) (*assessment.Document, render.Record, error) {
	row, body, err := l.Assessment(ctx, number)
	if err != nil {
		return nil, render.Record{}, err
	}
	doc, _, err := assessment.Decode(body)
	if err != nil {
		return nil, render.Record{}, err
	}
	line, _, err := history.ReadLine(ctx, l)
	if err != nil {
		return nil, render.Record{}, err
	}
	if x := line.Assessment(number); x == nil || x.Digest != row.Digest {
		return nil, render.Record{}, ledger.Damaged(fmt.Errorf("the digest in the row of assessment %d is not that of its entry", number))
	}
	return doc, recordOf(line, l.ID(), number, row.Digest), nil
}

// recordOf says what the ledger knows about an assessment.
func recordOf(line *approval.Line, ledger string, number int64, digest string) render.Record {
	s := line.State(number)
	rec := render.Record{
		Ledger: ledger, Number: number, Digest: digest, State: s.Word, Missing: append([]string{}, s.Missing...), Blocks: append([]string{}, s.Blocks...),
		Superseded: s.Superseded, SignOffs: []render.SignOff{},
	}
	records := s.Signed
	for _, r := range s.RejectedBy {
		if r.Assessment != number {
			records = append(records, r)
		}
	}
	for _, r := range records {
		rec.SignOffs = append(rec.SignOffs, render.SignOff{
			Assessment: r.Assessment, Entry: r.Entry.Seq, Role: r.Role, Decision: r.Decision, Signer: r.Signer, Fingerprint: r.Fingerprint, Reason: r.Reason,
			Time: r.Time.UTC().Format(signoff.TimeLayout), Statement: string(r.Text), Signature: string(r.Signature), Command: render.VerifyCommand(r.Signer, r.Time),
		})
	}
	return rec
}
