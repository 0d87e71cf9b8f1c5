package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"runtime/debug"
	"strings"

	"github.com/spf13/cobra"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/diff"
	"speedtrail/history/ledger"
	"speedtrail/schema/source"
)

// run carries out one call and gives its exit status. Only here and in main is
// there a process; everything below takes its streams as arguments.
func run(ctx context.Context, args []string, stdin io.Reader, stdout, stderr io.Writer) int {
	app := &app{in: stdin, out: stdout, err: stderr}
	root := app.command()
	root.SetArgs(args)
	root.SetIn(stdin)
	root.SetOut(stdout)
	root.SetErr(stderr)
	err := root.ExecuteContext(ctx)
	app.endProgress()
	if err == nil || errors.Is(err, errFindings) {
		return statusOf(err)
	}
	if ctx.Err() != nil {
		fmt.Fprintln(stderr, "speedtrail: interrupted, nothing more was done")
		return statusFailed
	}
	app.printError(err)
	return statusOf(err)
}

// printError writes an error and what to do about it. Faults of a data set
// stand a line each.
func (a *app) printError(err error) {
	fmt.Fprintln(a.err, a.fitted("speedtrail: "+source.VisibleLines(err.Error())))
	if hint := hintOf(err); hint != "" {
		fmt.Fprintln(a.err, a.fitted("hint: "+source.VisibleLines(a.advise(hint))))
	}
}

// app is one call: its streams and the options that all commands share.
type app struct {
	in       io.Reader
	out, err io.Writer

	repo   string
	data   string
	ledger string
	format string
	outTo  string
	color  string
	quiet  bool

	bar  *bar
	tags map[string]string // by commit, once they were asked for
}

// command builds the tree of commands.
func (a *app) command() *cobra.Command {
	root := &cobra.Command{
		Use:   "speedtrail",
		Short: "what a change of route speed data means for the trains",
		Long: `speedtrail compares two revisions of route speed data that is kept in Git. It
compiles the most restrictive speed profile of every reference train on both
sides, states who is faster or slower where and because of which source row,
and keeps the result in an append-only ledger.

Start with "speedtrail demo".

Exit status: 0 done, nothing against it; 1 done, and there is an unaccepted
finding, or verify found something wrong; 2 the call or the data is wrong; 3 the
work could not be done (disk, ledger, repository).

NO_COLOR and --color are respected. Results go to standard output, progress and
remarks to standard error.`,
		SilenceUsage:  true,
		SilenceErrors: true,
		Args: func(c *cobra.Command, args []string) error {
			if len(args) > 0 {
				hint := "speedtrail --help lists the commands"
				if near := c.SuggestionsFor(args[0]); len(near) > 0 {
					hint = "did you mean " + strings.Join(near, ", ") + "? " + hint
				}
				return badCall(hint, "unknown command %q", args[0])
			}
			return nil
		},
		RunE: func(c *cobra.Command, _ []string) error { return c.Help() },
	}
	root.Version = version()
	root.SuggestionsMinimumDistance = 2
	root.SetVersionTemplate("speedtrail {{.Version}}, rules version " + fmt.Sprint(diff.RulesVersion) + ", ledger format " + fmt.Sprint(ledger.Format) + "\n")
	flags := root.PersistentFlags()
	flags.StringVar(&a.repo, "repo", ".", "the Git `repository`, or a folder in it; bare ones too")
	flags.StringVar(&a.data, "data", ".", "the data set's `folder` inside the repository")
	flags.StringVar(&a.ledger, "ledger", "", "the ledger `file` (default speedtrail/ledger.db in the common Git folder)")
	flags.StringVar(&a.color, "color", "auto", "auto, always or never")
	flags.BoolVarP(&a.quiet, "quiet", "q", false, "no progress and no remarks")
	root.SetFlagErrorFunc(func(c *cobra.Command, err error) error {
		return badCall(flagHint(c, err), "%v", err)
	})
	root.AddCommand(a.demoCommand(), a.validateCommand(), a.profileCommand(), a.assessCommand(), a.reportCommand(), a.registerCommand(), a.traceCommand(),
		a.signCommand(), a.anchorCommand(), a.revokeCommand(), a.inforceCommand(), a.verifyCommand(), a.exportCommand(), a.importCommand())
	root.CompletionOptions.HiddenDefaultCmd = true
	root.PersistentPreRunE = func(c *cobra.Command, _ []string) error {
		if err := chosen("--color", a.color, "auto", "always", "never"); err != nil {
			return err
		}
		return a.spareLedger(c)
	}
	withCaution(root)
	// The usual template lets long lines of options run on.
	root.SetUsageTemplate(strings.ReplaceAll(root.UsageTemplate(), ".FlagUsages", ".FlagUsagesWrapped 80"))
	return root
}

// version names the build, as the Go tool knows it.
func version() string {
	info, ok := debug.ReadBuildInfo()
	if !ok || info.Main.Version == "" {
		return "(unversioned build)"
	}
	return info.Main.Version
}

// withCaution ends every help text with the caution.
func withCaution(root *cobra.Command) {
	help := root.HelpFunc()
	root.SetHelpFunc(func(c *cobra.Command, args []string) {
		c.Long = filled(c.Long, 80)
		help(c, args)
		fmt.Fprintf(c.OutOrStdout(), "\n%s\n", wrap("Caution: "+render.Caution, 80))
	})
}

// filled wraps the paragraphs of a text; those whose lines are set in stay.
func filled(text string, width int) string {
	paragraphs := strings.Split(text, "\n\n")
	for i, p := range paragraphs {
		if !strings.Contains("\n"+p, "\n ") {
			paragraphs[i] = wrap(p, width)
		}
	}
	return strings.Join(paragraphs, "\n\n")
}

// wrap breaks a text into lines of at most width columns.
func wrap(text string, width int) string { return strings.Join(render.Wrap(text, width), "\n") }

// arguments checks how many there are, with a message in the same form as all
// others.
func arguments(least, most int) cobra.PositionalArgs {
	return func(c *cobra.Command, args []string) error {
		if len(args) < least || len(args) > most {
			problem := fmt.Sprintf("%d %s given, at most %d allowed", len(args), plural(len(args), "argument is", "arguments are"), most)
			if len(args) < least {
				// The line of use names them in their order.
				problem = joined(strings.Fields(c.Use)[1+len(args):1+least]) + " is missing"
			}
			return badCall("usage: "+c.UseLine(), "%s", problem)
		}
		return nil
	}
}
