package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"speedtrail/cmd/speedtrail/internal/demo"
	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/history/assessment"
	"speedtrail/history/compose"
	"speedtrail/schema/source"
)

func (a *app) demoCommand() *cobra.Command {
	return &cobra.Command{
		Use:   "demo [DIR]",
		Short: "the main job on an invented network",
		Long: `demo writes an invented railway network as a Git repository with a history of a
year into a new folder (speedtrail-demo unless given), with a ledger of the year's
assessments, sign-offs by invented people with test keys and a log of what went into
service; assesses the last release, records the result, writes the change report and
says what to look at. A folder that is not empty is left alone. Exit status 0
when that is done, whatever the findings.`,
		Args: arguments(0, 1),
		RunE: func(c *cobra.Command, args []string) error {
			dir := "speedtrail-demo"
			if len(args) == 1 {
				dir = args[0]
			}
			return a.demo(c.Context(), dir)
		},
	}
}

func (a *app) demo(ctx context.Context, dir string) (err error) {
	undo := compose.Undo(dir)
	network, err := demo.Write(ctx, dir)
	if errors.Is(err, compose.ErrNotEmpty) {
		return badCall("name a folder that is not there yet: speedtrail demo DIR", "%s is not empty and was left alone", dir)
	}
	if err != nil {
		return fmt.Errorf("the demonstration was not written: %w", err)
	}
	// Half a demonstration would be of no use, and be in the way of the next.
	defer func() {
		if err != nil {
			undo()
		}
	}()
	fmt.Fprintf(a.out, "Wrote an invented network with its history to %s\n\n", source.Visible(dir))
	a.repo, a.format = dir, "text"
	repo, err := a.openRepo()
	if err != nil {
		return err
	}
	defer repo.Close()
	if err := a.demoAudit(ctx, repo, dir); err != nil {
		return fmt.Errorf("the demonstration's audit trail was not written: %w", err)
	}
	doc, err := a.compute(ctx, repo, comparison{base: network.Base, target: network.Target, Options: assessment.Options{Requests: []string{}}, whole: true, since: fromBase})
	if err != nil {
		return err
	}
	var into recording
	defer into.close()
	rec, err := a.record(ctx, doc, &into)
	if err != nil {
		return err
	}
	style := a.style()
	style.Brief = true
	if err := a.write(func(w io.Writer) error { return render.Text(w, doc, rec, style) }); err != nil {
		return err
	}
	file := filepath.Join(dir, "change-report.html")
	a.outTo, a.format = file, "html"
	if err := a.render(doc, rec); err != nil {
		return err
	}
	fmt.Fprintf(a.out, "\nThe change report: %s (open it in a browser)\n", source.Visible(file))
	a.printHints(network, dir)
	return nil
}

// printHints says what to look at and what to try next.
func (a *app) printHints(network demo.Repository, dir string) {
	fmt.Fprintf(a.out, "\nWhat to look at, in the folder of the network (go install ./cmd/speedtrail puts\nthe program on the path)\n      cd %s\n", source.Visible(dir))
	for _, h := range network.Look {
		fmt.Fprintf(a.out, "\n- %s\n", strings.ReplaceAll(wrap(h.Text, 76), "\n", "\n  "))
		if h.Command != "" {
			fmt.Fprintf(a.out, "      %s\n", h.Command)
		}
	}
	fmt.Fprintf(a.out, "\n%s\n", wrap("Caution: "+render.Caution, 78))
}
