package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"

	"github.com/spf13/cobra"

	"speedtrail/history"
	"speedtrail/schema/source"
)

func (a *app) exportCommand() *cobra.Command {
	c := &cobra.Command{
		Use:   "export [ID]",
		Short: "the ledger as JSON Lines",
		Long: `export writes every entry of the ledger as a line of JSON, the oldest first. Any
language can check the chain; import makes a ledger with the same head.

A signer on another machine imports it, computes an assessment anew in a clone of
the repository and signs with "sign ID --write FILE"; the custodian of the ledger
records what comes back. With ID that assessment has to be there.`,
		Example: `  speedtrail export --out ledger.jsonl
  speedtrail export 3 --out bundle.jsonl`,
		Args: arguments(0, 1),
		RunE: func(c *cobra.Command, args []string) error { return a.export(c.Context(), args) },
	}
	c.Flags().StringVarP(&a.outTo, "out", "o", "", "write to a `file`, whole or not at all")
	return c
}

func (a *app) export(ctx context.Context, args []string) error {
	l, err := a.openLedger(ctx, false)
	if err != nil {
		return err
	}
	defer l.Close()
	var number int64
	if len(args) == 1 {
		if number, err = assessmentNumber(args[0]); err != nil {
			return err
		}
		if _, _, err := l.Assessment(ctx, number); err != nil {
			return err
		}
	}
	// What import would refuse is no copy of the ledger.
	if _, _, err := history.ReadLine(ctx, l); err != nil {
		return err
	}
	if err := a.write(func(w io.Writer) error { return history.Export(ctx, l, w) }); err != nil {
		return err
	}
	a.remarkFile()
	if number > 0 {
		a.remark("the signer: speedtrail import FILE --ledger copy.db, then in a clone: speedtrail sign %d --ledger copy.db --role ROLE --decision approve --reason TEXT --key FILE --write statement; the custodian: %s", number, a.advise(fmt.Sprintf("speedtrail sign %d --statement statement --signature statement.sig", number)))
	}
	return nil
}

func (a *app) importCommand() *cobra.Command {
	return &cobra.Command{
		Use:   "import FILE",
		Short: "make a ledger from an export",
		Long: `import makes a new ledger from an export and checks the chain on the way. The head
is the same. A ledger that is there already is never written over; name another
file with --ledger. "-" reads standard input.`,
		Args: arguments(1, 1),
		RunE: func(c *cobra.Command, args []string) error { return a.importLedger(c.Context(), args[0]) },
	}
}

func (a *app) importLedger(ctx context.Context, name string) error {
	file, err := a.ledgerFile()
	if err != nil {
		return err
	}
	in := a.in
	if name != "-" {
		f, err := os.Open(name)
		if err != nil {
			return badCall("export writes such a file", "%s cannot be read: %v", name, err)
		}
		defer f.Close()
		in = f
	}
	head, err := history.Import(ctx, file, in)
	var faulty *history.ImportError
	if errors.As(err, &faulty) {
		return badCall("nothing was imported; get the export again", "%s:%d: %v", name, faulty.Line, faulty.Err)
	}
	if err != nil {
		return fmt.Errorf("nothing was imported: %w", err)
	}
	a.remark("imported into %s; head of the ledger %s", source.Visible(file), head)
	return nil
}
