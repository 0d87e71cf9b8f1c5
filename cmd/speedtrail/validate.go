package main

import (
	"context"
	"errors"
	"fmt"
	"io"

	"github.com/spf13/cobra"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/history/assessment"
	"speedtrail/schema"
	"speedtrail/schema/source"
)

func (a *app) validateCommand() *cobra.Command {
	var doubtful bool
	c := &cobra.Command{
		Use:   "validate [REV]",
		Short: "list every fault of the data set at a revision",
		Long: `validate reads the whole data set at a revision (the working tree unless given)
and lists every fault with file, line and column. Exit status 0: none, 2: some.
With --doubtful it also looks for doubtful data on every route, also on those that no
change touches: what obeys the rules and should be looked at all the same, such as a
temporary restriction that has expired. Exit status 1: some that accepted.toml does not
accept. Times are compared with the date of the commit, those of the working tree with
the clock.
What requests and accepted.toml name and the revision does not have is remarked on
standard error, since assess holds the requests of a change to it; so are checks for
which no limit is set, and axle load rows without a speed.`,
		Example: `  speedtrail validate
  speedtrail validate release-2
  speedtrail validate --doubtful`,
		Args: arguments(0, 1),
		RunE: func(c *cobra.Command, args []string) error {
			rev := workingTree
			if len(args) == 1 {
				rev = args[0]
			}
			return a.validate(c.Context(), rev, doubtful)
		},
	}
	c.Flags().BoolVar(&doubtful, "doubtful", false, "look for doubtful data, too")
	a.outputFlags(c, "text", "json")
	return c
}

// validation is the JSON form of a validation.
type validation struct {
	Format   string            `json:"format"`
	Revision string            `json:"revision"` // full hash, empty for the working tree
	Dataset  string            `json:"dataset"`
	Routes   int               `json:"routes"`
	Trains   int               `json:"trains"`
	Faults   []validationFault `json:"faults"`
	Unlisted int               `json:"faults_not_listed"`
	// Doubtful is null where it was not asked for, or the data set is faulty.
	Doubtful *assessment.Doubtful `json:"doubtful" jsonschema:"nullable"`
}

type validationFault struct {
	File    string `json:"file"`
	Line    int    `json:"line"`
	Column  int    `json:"column"`
	Problem string `json:"problem"`
}

// errFaulty ends validate with the status of faulty data, its result printed.
var errFaulty = &callError{problem: "the data set is faulty"}

func (a *app) validate(ctx context.Context, rev string, doubtful bool) error {
	repo, err := a.openRepo()
	if err != nil {
		return err
	}
	defer repo.Close()
	s, err := a.openSide(repo, rev)
	if err != nil {
		return err
	}
	data, err := schema.Load(ctx, s.files)
	faults := &source.Faults{}
	if err != nil && !errors.As(err, &faults) {
		return err
	}
	good := err == nil
	var found *assessment.Doubtful
	if good && doubtful {
		at, err := s.time()
		if err != nil {
			return err
		}
		found = assessment.DoubtfulData(data, at)
	}
	if err := a.write(func(w io.Writer) error { return a.printValidation(w, s, data, faults, found) }); err != nil {
		return err
	}
	if good {
		for _, text := range doubtfulNames(data) {
			a.remark("remark: %s", text)
		}
	}
	if faults.Count > 0 {
		return fmt.Errorf("%w at %s: %d %s", errFaulty, s.label(), faults.Count, plural(faults.Count, "fault", "faults"))
	}
	if found != nil && found.Open() > 0 {
		return errFindings
	}
	return nil
}

func (a *app) printValidation(w io.Writer, s side, data *schema.Dataset, faults *source.Faults, doubtful *assessment.Doubtful) error {
	if a.format == "json" {
		v := validation{Format: "speedtrail-validation 1", Revision: s.commit.Hash, Faults: []validationFault{}, Unlisted: faults.Count - len(faults.List), Doubtful: doubtful}
		if data != nil {
			v.Dataset, v.Routes, v.Trains = data.Name, len(data.Routes), len(data.Trains)
		}
		for _, f := range faults.List {
			v.Faults = append(v.Faults, validationFault{f.File, f.Line, f.Column, f.Problem})
		}
		return indentedJSON(w, v)
	}
	if faults.Count > 0 {
		_, err := fmt.Fprintln(w, faults.Error())
		return err
	}
	line := fmt.Sprintf("%s: no fault in %q (%d %s, %d reference %s, %d change %s)", source.Visible(s.label()), data.Name,
		len(data.Routes), plural(len(data.Routes), "route", "routes"),
		len(data.Trains), plural(len(data.Trains), "train", "trains"),
		len(data.Requests), plural(len(data.Requests), "request", "requests"))
	if _, err := fmt.Fprintln(w, render.Hanging(line, a.style().Width, "  ")); err != nil || doubtful == nil {
		return err
	}
	return render.Doubtful(w, doubtful, a.style())
}

// plural picks a word for a number.
func plural(n int, one, many string) string {
	if n == 1 {
		return one
	}
	return many
}
