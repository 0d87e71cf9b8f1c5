package main

import (
	"context"
	"fmt"
	"slices"
	"time"

	"github.com/spf13/cobra"

	"speedtrail/history"
	"speedtrail/history/approval"
	"speedtrail/history/chain"
	"speedtrail/history/signoff"
	"speedtrail/schema/source"
)

func (a *app) inforceRecordCommand() *cobra.Command {
	var s signing
	var since string
	var routes []string
	var replaces, voids int64
	c := &cobra.Command{
		Use:   "record REV --since T --reason TEXT --key FILE",
		Short: "record that a revision went into service",
		Long: `record states that a revision is in force from an instant on, on the whole network or
on some routes. It is signed by somebody who may take the role in-service by the
newest approved policy. An earlier record is corrected by a new one that replaces or
voids it. --voids ENTRY is enough by itself: REV, --since and --routes are those of the
record that was wrong.

--statement FILE --signature FILE.sig take up what was signed elsewhere, with REV and
without --since and --reason, which the statement says.`,
		Example: `  speedtrail inforce record release-2 --since 2026-03-08T03:00:00Z --reason "timetable change" --key ~/.ssh/id_ed25519
  speedtrail inforce record release-3 --since 2026-04-01T03:00:00Z --routes SM1,SM2 --reason "track renewed" --key ~/.ssh/id_ed25519
  speedtrail inforce record --voids 17 --reason "put off" --key ~/.ssh/id_ed25519`,
		Args: arguments(0, 1),
		RunE: func(c *cobra.Command, args []string) error {
			if err := s.alone(c); err != nil {
				return err
			}
			if err := s.check(); err != nil {
				return err
			}
			if c.Flags().Changed("routes") && len(routes) == 0 {
				return badCall("leave it out for the whole network", "--routes names no route")
			}
			corrects, err := correctionOf(c, replaces, voids)
			if err != nil {
				return err
			}
			x := servicing{routes: routes, voids: voids, corrects: corrects}
			if len(args) > 0 {
				x.rev = args[0]
			} else if s.statement == "" && voids == 0 {
				return badCall("usage: "+c.UseLine(), "REV is missing")
			}
			if c.Flags().Changed("since") || s.statement == "" && voids == 0 {
				t, err := parseInstant(since, "--since")
				if err != nil {
					return err
				}
				x.since = &t
			}
			return a.inforceRecord(c.Context(), x, &s)
		},
	}
	s.flags(c)
	c.Flags().StringVar(&since, "since", "", "the `instant` from which on, RFC 3339 with a time zone")
	c.Flags().StringSliceVar(&routes, "routes", nil, "the `ids` of routes; the whole network unless given")
	c.Flags().Int64Var(&replaces, "replaces", 0, "the `entry` of a record that this one replaces")
	c.Flags().Int64Var(&voids, "voids", 0, "the `entry` of a record that was wrong and that nothing takes the place of")
	return c
}

// correctionOf says what a record corrects, as statements write it. A number that
// names no entry would otherwise leave the record standing that it was to correct.
func correctionOf(c *cobra.Command, replaces, voids int64) (string, error) {
	given := func(name string) bool { return c.Flags().Changed(name) }
	switch {
	case given("replaces") && given("voids"):
		return "", badCall("choose one", "--replaces and --voids are both given")
	case given("replaces") && replaces < 1:
		return "", badCall("speedtrail inforce lists the records with their entries", "--replaces %d is the number of no entry", replaces)
	case given("voids") && voids < 1:
		return "", badCall("speedtrail inforce lists the records with their entries", "--voids %d is the number of no entry", voids)
	case given("replaces"):
		return fmt.Sprintf("%s %d", approval.Replaces, replaces), nil
	case given("voids"):
		return fmt.Sprintf("%s %d", approval.Voids, voids), nil
	}
	return approval.CorrectsNothing, nil
}

// servicing is what a record of what went into service is asked to say. Where it voids
// another one, what is not given is that of the other.
type servicing struct {
	rev      string
	since    *time.Time
	routes   []string
	voids    int64
	corrects string
}

func (a *app) inforceRecord(ctx context.Context, x servicing, s *signing) error {
	l, err := a.openLedgerFor(ctx, s.write == "")
	if err != nil {
		return err
	}
	defer l.Close()
	folder, err := a.folder()
	if err != nil {
		return err
	}
	line, err := a.readLine(ctx, l)
	if err != nil {
		return err
	}
	var brought *signed
	if s.statement != "" {
		if brought, err = s.brought(); err != nil {
			return err
		}
		if x, err = x.asBrought(line, folder, brought); err != nil {
			return err
		}
	}
	var statement signoff.Statement
	if x.voids > 0 {
		statement, err = a.voiding(line, folder, x)
	} else {
		statement, err = a.entering(ctx, folder, x, brought)
	}
	if err != nil {
		return err
	}
	if brought == nil {
		statement.Ledger, statement.Folder, statement.Corrects = l.ID(), folder, x.corrects
		if brought, err = s.signInForce(ctx, a, line, statement, x.voids); err != nil || brought == nil {
			return err
		}
	}
	return a.recordSigned(ctx, l, line, chain.InForce, brought)
}

// asBrought gives what a statement that was signed elsewhere is asked to say: where it
// voids a record, all of it.
func (x servicing) asBrought(line *approval.Line, folder string, brought *signed) (servicing, error) {
	st, err := signoff.Parse(brought.statement)
	if err != nil {
		return x, nil // its recording says what is wrong
	}
	word, entry, ok := approval.ReadCorrection(st.Corrects)
	if !ok || word != approval.Voids {
		return x, nil
	}
	return servicing{rev: x.rev, since: &st.Since, routes: st.Routes, voids: entry, corrects: st.Corrects}, voidsAsRecorded(line, folder, st)
}

// signInForce fills in who states a record and why, says what is odd about it, asks,
// and signs; it gives nothing where the statement is only written. voids is the entry
// that it takes back; 0 for none.
func (s *signing) signInForce(ctx context.Context, a *app, line *approval.Line, statement signoff.Statement, voids int64) (*signed, error) {
	p := line.Newest(statement.Folder)
	if p.Parsed == nil {
		return nil, refused(fmt.Errorf("no policy is anchored for the folder %s; speedtrail anchor puts one in force", statement.Folder))
	}
	key, done, err := s.signerKey(ctx, a, p.Parsed, newestPolicy)
	if err != nil {
		return nil, err
	}
	defer done()
	statement.Kind, statement.Policy, statement.Role, statement.Reason = signoff.InForce, p.Hash, approval.InServiceRole, s.reason
	statement.Time, statement.Head = time.Now().UTC().Truncate(time.Second), seen(line)
	if err := s.complete(&statement, key, p.Parsed, newestPolicy); err != nil {
		return nil, err
	}
	if err := a.foresee(line, statement, key); err != nil {
		return nil, err
	}
	if voids > 0 {
		a.remark("it takes back entry %d: %s", voids, serviceRecordOf(line, history.ServiceOf(line, *standing(line, statement.Folder, voids))).words(a.named))
	} else {
		a.remarkOdd(line, &statement)
	}
	return s.finish(ctx, a, statement, key)
}

// remarkOdd says what is odd about a revision that is said to go into service.
func (a *app) remarkOdd(line *approval.Line, s *signoff.Statement) {
	if !line.ApprovedContent(s.Folder, s.Content) {
		a.remark("! the revision is not approved: finding %s", history.ServiceUnapproved)
	}
	for _, e := range toBeReviewed(evidenceOf(line, s.Folder, s.Content, approvedThrough(line, s.Folder, s.Content))) {
		a.remark("! %s: %s", e.by(), e.review())
	}
	if s.Since.After(s.Time) {
		a.remark("! %s lies in the future: until then the revision is not in force, and after it nothing asks whether it went into service", s.Since.Format(signoff.TimeLayout))
	}
}

// approvedThrough lists the approved assessments whose target has a content.
func approvedThrough(line *approval.Line, folder, content string) (list []int64) {
	for _, x := range line.Assessments() {
		if x.Folder == folder && x.TargetTree == content && line.State(x.Number).Word == approval.Approved {
			list = append(list, x.Number)
		}
	}
	return list
}

// entering gives what a statement says of a revision that went into service.
func (a *app) entering(ctx context.Context, folder string, x servicing, brought *signed) (signoff.Statement, error) {
	var st signoff.Statement
	if x.rev == "" {
		return st, badCall("speedtrail inforce record REV --statement FILE --signature FILE.sig", "REV is missing, which the statement is held against")
	}
	if x.rev == workingTree {
		return st, badCall("name a commit", "the working tree cannot be in force")
	}
	repo, err := a.openRepo()
	if err != nil {
		return st, err
	}
	defer repo.Close()
	at, err := a.openSide(repo, x.rev)
	if err != nil {
		return st, err
	}
	data, err := at.load(ctx)
	if err != nil {
		return st, err
	}
	for _, id := range x.routes {
		if routeByID(data, id) == nil {
			return st, badCall(meant(id, routeIDs(data), "routes of that revision: "+some(routeIDs(data))), "%s has no route %q", x.rev, id)
		}
	}
	st.Revision, st.Content, st.Routes = at.commit.Hash, content(at.files), x.routes
	if brought != nil {
		return st, broughtAbout(brought, st.Revision, folder, st.Content, data)
	}
	st.Since = *x.since
	return st, nil
}

// voiding gives what a statement says that takes a record back: the same as the record.
// What else was named has to be that, else the statement would contradict the record,
// and whoever reads it would not know which one was meant.
func (a *app) voiding(line *approval.Line, folder string, x servicing) (st signoff.Statement, err error) {
	r := standing(line, folder, x.voids)
	if r == nil {
		return st, refused(fmt.Errorf("entry %d is no in-force record that stands for the folder %s", x.voids, folder))
	}
	st.Revision, st.Content, st.Routes, st.Since = r.Revision, r.Content, r.Routes, r.Since
	named := st
	if x.since != nil {
		named.Since = *x.since
	}
	if x.routes != nil {
		named.Routes = x.routes
	}
	if x.rev == workingTree {
		return st, badCall("leave it out", "the working tree cannot be in force")
	}
	if x.rev != "" {
		repo, err := a.openRepo()
		if err != nil {
			return st, err
		}
		defer repo.Close()
		c, err := resolve(repo, x.rev)
		if err != nil {
			return st, err
		}
		named.Revision = c.Hash
	}
	return st, voidsAnother(r, named)
}

// voidsAsRecorded refuses a statement that was signed elsewhere and takes a record back
// while it says something else than the record does.
func voidsAsRecorded(line *approval.Line, folder string, st signoff.Statement) error {
	_, entry, _ := approval.ReadCorrection(st.Corrects)
	r := standing(line, folder, entry)
	if r == nil || st.Folder != folder {
		return nil // its recording says what is wrong
	}
	if st.Content != r.Content {
		return refused(fmt.Errorf("entry %d is about the content %s, not %s", entry, r.Content, source.Visible(st.Content)))
	}
	return voidsAnother(r, st)
}

// voidsAnother refuses to void a record by what it does not say.
func voidsAnother(r *approval.Record, named signoff.Statement) error {
	routes := func(ids []string) string {
		if len(ids) == 0 {
			return signoff.AllRoutes
		}
		return joined(slices.Compact(slices.Sorted(slices.Values(ids))))
	}
	for _, x := range []struct{ name, have, named string }{
		{"commit", r.Revision, named.Revision}, {"instant", r.Since.UTC().Format(signoff.TimeLayout), named.Since.UTC().Format(signoff.TimeLayout)},
		{"routes", routes(r.Routes), routes(named.Routes)},
	} {
		if x.have != x.named {
			return badCall("nothing was recorded; --voids ENTRY is enough, REV, --since and --routes are those of the record", "entry %d, which is to be voided, is about the %s %s, not %s", r.Entry.Seq, x.name, source.Visible(x.have), source.Visible(x.named))
		}
	}
	return nil
}

// standing finds an in-force record of a folder that nothing has corrected.
func standing(line *approval.Line, folder string, entry int64) *approval.Record {
	for _, r := range line.Standing(folder) {
		if r.Entry.Seq == entry {
			return &r
		}
	}
	return nil
}
