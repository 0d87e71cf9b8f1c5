package main

import (
	"context"
	"strconv"

	"github.com/spf13/cobra"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/history/assessment"
	"speedtrail/history/ledger"
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
			n, err := strconv.ParseInt(args[0], 10, 64)
			if err != nil || n < 1 {
				return badCall("speedtrail register lists the assessments", "%q is not the number of an assessment", args[0])
			}
			return a.report(c.Context(), n)
		},
	}
	a.outputFlags(c, "html", "text", "markdown", "csv", "json")
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
	return a.render(doc, rec)
}

// recorded reads an assessment back from the ledger.
func recorded(ctx context.Context, l *ledger.Ledger, number int64) (*assessment.Document, render.Record, error) {
	row, body, err := l.Assessment(ctx, number)
	if err != nil {
		return nil, render.Record{}, err
	}
	doc, err := assessment.Decode(body)
	if err != nil {
		return nil, render.Record{}, err
	}
	return doc, render.Record{Ledger: l.ID(), Number: number, Digest: row.Digest, State: stateOpen}, nil
}
