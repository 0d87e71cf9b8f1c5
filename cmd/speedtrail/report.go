package main

import (
	"context"
	"fmt"

	"github.com/spf13/cobra"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/history/approval"
	"speedtrail/history/assessment"
	"speedtrail/history/chain"
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
	r, err := a.recorded(ctx, l, number)
	if err != nil {
		return err
	}
	if err := a.render(r.doc, r.standing()); err != nil {
		return err
	}
	a.remarkHidden(r.doc)
	a.remarkFile()
	return nil
}

// remarkFile says where a result went that is not on the screen.
func (a *app) remarkFile() {
	if a.outTo != "" {
		a.remark("written to %s", source.Visible(a.outTo))
	}
}

// recorded is an assessment as the ledger has it, with what the line of approval
// says of it.
type recorded struct {
	*approval.Assessment
	doc    *assessment.Document
	line   *approval.Line
	ledger string // its id
}

// standing says what the ledger knows about the assessment now.
func (r *recorded) standing() render.Record { return recordOf(r.line, r.ledger, r.Number, r.Digest) }

// recorded reads an assessment back from the ledger, and follows the line. Two ways
// lead to the document, the row of a number and the entries one after the other: that
// they lead to the same one is asked of the bytes, since a row, or the index by which
// it is found, can be altered, also while this reads.
func (a *app) recorded(ctx context.Context, l *ledger.Ledger, number int64) (*recorded, error) {
	_, e, err := l.Assessment(ctx, number)
	if err != nil {
		return nil, err
	}
	doc, digest, err := assessment.Decode(e.Body)
	if err != nil {
		return nil, err
	}
	line, err := a.readLine(ctx, l)
	if err != nil {
		return nil, err
	}
	x := line.Assessment(number)
	if x == nil || x.Digest != digest || x.Entry != e.Head() || chain.Check(chain.Head{Seq: e.Seq - 1, Hash: e.Previous}, e) != nil {
		return nil, misled(number)
	}
	return &recorded{x, doc, line, l.ID()}, nil
}

// misled says that the row of an assessment leads to something else than it did.
func misled(number int64) error {
	return ledger.Damaged(fmt.Errorf("the row of assessment %d does not lead to its entry", number))
}

// recordOf says what the ledger knows about an assessment.
func recordOf(line *approval.Line, ledger string, number int64, digest string) render.Record {
	s := line.State(number)
	rec := render.Record{
		Ledger: ledger, Number: number, Digest: digest, State: s.Word, Missing: append([]string{}, s.Missing...), Blocks: append([]string{}, s.Blocks...),
		Superseded: s.Superseded, SignOffs: []render.SignOff{},
	}
	for _, r := range decisionsOn(s, number) {
		rec.SignOffs = append(rec.SignOffs, render.SignOff{
			Assessment: r.Assessment, Entry: r.Entry.Seq, Role: r.Role, Decision: r.Decision, Signer: r.Signer, Fingerprint: r.Fingerprint, Reason: r.Reason, Revoked: revocationOf(line, r.Fingerprint), Elsewhere: elsewhereOf(line, r),
			Time: r.Time.UTC().Format(signoff.TimeLayout), Statement: string(r.Text), Signature: string(r.Signature), Command: render.VerifyCommand(r.Signer, r.Time),
		})
	}
	return rec
}
