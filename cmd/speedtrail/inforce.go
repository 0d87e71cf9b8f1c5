package main

import (
	"context"
	"fmt"
	"io"
	"strings"
	"time"

	"github.com/spf13/cobra"

	"speedtrail/cmd/speedtrail/internal/render"
	"speedtrail/history"
	"speedtrail/history/approval"
	"speedtrail/history/chain"
	"speedtrail/history/signoff"
	"speedtrail/schema"
	"speedtrail/schema/source"
)

func (a *app) inforceCommand() *cobra.Command {
	var when, route, at string
	c := &cobra.Command{
		Use:   "inforce [--when T [--route R --at KM]]",
		Short: "what was in force when",
		Long: `inforce lists which revisions went into service when, by whose record, and what
about it needs eyes: revisions in service without approval, approved ones that never
went into service, entries that do not count. Exit status 1 if there is any.

With --when it answers which revision was in force at an instant, with the whole
chain of evidence; with --route and --at also the effective speed at a point for
every reference train of that revision, temporary restrictions by their validity.`,
		Example: `  speedtrail inforce
  speedtrail inforce --when 2026-03-14T05:12:00Z --route SM1 --at 12.4
  speedtrail inforce record release-2026.1 --since 2026-03-08T03:00:00Z --reason "timetable change" --key ~/.ssh/id_ed25519`,
		Args: arguments(0, 0),
		RunE: func(c *cobra.Command, _ []string) error {
			if (route == "") != (at == "") {
				return badCall("--route R --at KM", "--route and --at belong together")
			}
			if when == "" {
				if route != "" {
					return badCall("for example --when 2026-03-14T05:12:00Z", "--when is missing")
				}
				return a.inforceLog(c.Context())
			}
			t, err := parseInstant(when, "--when")
			if err != nil {
				return err
			}
			return a.inforceWhen(c.Context(), t, route, at)
		},
	}
	a.outputFlags(c, "text", "json")
	c.Flags().StringVar(&when, "when", "", "an `instant`, RFC 3339 with a time zone")
	c.Flags().StringVar(&route, "route", "", "the `id` of a route")
	c.Flags().StringVar(&at, "at", "", "a position in `km`")
	c.AddCommand(a.inforceRecordCommand())
	return c
}

// parseInstant reads a date-time with its time zone.
func parseInstant(text, option string) (time.Time, error) {
	t, err := time.Parse(time.RFC3339, text)
	if err != nil {
		return t, badCall("write it as 2026-03-14T05:12:00Z or 2026-03-14T06:12:00+01:00", "%s %q is no date-time with a time zone", option, text)
	}
	return t.UTC(), nil
}

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
voids it; with --voids repeat REV and --since of the record that was wrong.

--statement FILE --signature FILE.sig take up what was signed elsewhere, with REV and
without --since and --reason, which the statement says.`,
		Example: `  speedtrail inforce record release-2 --since 2026-03-08T03:00:00Z --reason "timetable change" --key ~/.ssh/id_ed25519
  speedtrail inforce record release-3 --since 2026-04-01T03:00:00Z --routes SM1,SM2 --reason "track renewed" --key ~/.ssh/id_ed25519
  speedtrail inforce record release-3 --since 2026-04-01T03:00:00Z --voids 17 --reason "put off" --key ~/.ssh/id_ed25519`,
		Args: arguments(1, 1),
		RunE: func(c *cobra.Command, args []string) error {
			if err := s.alone(c); err != nil {
				return err
			}
			if err := s.check(); err != nil {
				return err
			}
			var t time.Time
			if s.statement == "" {
				var err error
				if t, err = parseInstant(since, "--since"); err != nil {
					return err
				}
			}
			if c.Flags().Changed("routes") && len(routes) == 0 {
				return badCall("leave it out for the whole network", "--routes names no route")
			}
			corrects, err := correctionOf(c, replaces, voids)
			if err != nil {
				return err
			}
			return a.inforceRecord(c.Context(), args[0], t, routes, corrects, &s)
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

func (a *app) inforceRecord(ctx context.Context, rev string, since time.Time, routes []string, corrects string, s *signing) error {
	l, err := a.openLedgerFor(ctx, s.write == "")
	if err != nil {
		return err
	}
	defer l.Close()
	repo, err := a.openRepo()
	if err != nil {
		return err
	}
	defer repo.Close()
	if rev == workingTree {
		return badCall("name a commit", "the working tree cannot be in force")
	}
	at, err := a.openSide(repo, rev)
	if err != nil {
		return err
	}
	data, err := schema.Load(ctx, at.files)
	if err != nil {
		return &sideError{at.label(), err}
	}
	for _, id := range routes {
		if routeByID(data, id) == nil {
			return badCall(meant(id, routeIDs(data), "routes of that revision: "+some(routeIDs(data))), "%s has no route %q", rev, id)
		}
	}
	folder, err := a.folder()
	if err != nil {
		return err
	}
	line, err := a.readLine(ctx, l)
	if err != nil {
		return err
	}
	if s.statement != "" {
		brought, err := s.brought()
		if err != nil {
			return err
		}
		if err := broughtAbout(brought, at.commit.Hash, folder, content(at.files), data); err != nil {
			return err
		}
		return a.recordSigned(ctx, l, line, chain.InForce, brought)
	}
	p := line.Newest(folder)
	if p.Parsed == nil {
		return refused(fmt.Errorf("no policy is anchored for the folder %s; speedtrail anchor puts one in force", folder))
	}
	key, done, err := s.signerKey(ctx, a, p.Parsed)
	if err != nil {
		return err
	}
	defer done()
	statement := signoff.Statement{
		Kind: signoff.InForce, Ledger: l.ID(), Revision: at.commit.Hash, Folder: folder, Content: content(at.files), Policy: p.Hash, Routes: routes,
		Since: since, Corrects: corrects, Role: approval.InServiceRole, Reason: s.reason, Time: time.Now().UTC().Truncate(time.Second), Head: seen(line),
	}
	if err := s.complete(&statement, key, p.Parsed); err != nil {
		return err
	}
	if err := a.foresee(line, statement, key); err != nil {
		return err
	}
	if !line.ApprovedContent(folder, statement.Content) && !strings.HasPrefix(corrects, approval.Voids) {
		a.remark("! the revision is not approved: finding %s", history.ServiceUnapproved)
	}
	if since.After(statement.Time) {
		a.remark("! %s lies in the future: until then the revision is not in force, and after it nothing asks whether it went into service", since.Format(signoff.TimeLayout))
	}
	result, err := s.finish(ctx, a, statement, key)
	if err != nil || result == nil {
		return err
	}
	return a.recordSigned(ctx, l, line, chain.InForce, result)
}

func routeByID(d *schema.Dataset, id string) *schema.Route {
	for _, r := range d.Routes {
		if r.ID == id {
			return r
		}
	}
	return nil
}

func routeIDs(d *schema.Dataset) []string {
	var ids []string
	for _, r := range d.Routes {
		ids = append(ids, r.ID)
	}
	return ids
}

// serviceAdvice says what to do about each kind of finding.
var serviceAdvice = map[string]string{
	history.ServiceUnapproved: "Have the data looked at and signed now, or take it out of service; that it ran without approval stays on record.",
	history.ServiceUndoes:     "Look at what the revision before had changed; assess from that one, and have it signed.",
	history.ServiceCorrected:  "Ask who took the record back, and what ran then; both records stay.",
	history.NeverInService:    "Record it when it goes into service: speedtrail inforce record REV --since T.",
	history.DoesNotCount:      "Ask who added the entry, and past which check; what it says has no effect.",
}

// serviceRecord is the JSON form of an in-force record.
type serviceRecord struct {
	Entry    int64    `json:"entry"`
	Revision string   `json:"revision"`
	Folder   string   `json:"folder"`
	Routes   []string `json:"routes"` // empty: all
	Since    string   `json:"since"`
	Signer   string   `json:"signer"`
	Key      string   `json:"key"`
	// Revoked is null while the key is in use.
	Revoked  *render.Revocation `json:"key_revoked" jsonschema:"nullable"`
	Stated   string             `json:"stated"`
	Recorded string             `json:"recorded"`
	Reason   string             `json:"reason"`
	Approved bool               `json:"approved"`
	lapsed   bool
	Late     string  `json:"approved_late"` // when, where that was after it went into service; else empty
	Undoes   bool    `json:"undoes"`
	Through  []int64 `json:"assessments"`
	// Review are the statements by which it is approved whose keys were revoked later.
	Review []evidence `json:"review"`
}

// serviceLog is the JSON form of the log of what went into service.
type serviceLog struct {
	Format  string          `json:"format"`
	Records []serviceRecord `json:"records"` // that stand, by instant
	// Corrected are the records that another one replaces or voids, by entry.
	Corrected []correctedRecord `json:"corrected"`
	Findings  []serviceFinding  `json:"findings"`
}

// correctedRecord is an in-force record that does not stand any more.
type correctedRecord struct {
	Record serviceRecord `json:"record"`
	How    string        `json:"how" jsonschema:"enum=replaces,enum=voids"` // what the later one does
	Entry  int64         `json:"by_entry"`                                  // the later one
	Signer string        `json:"by_signer"`
	// Revoked is null while the key of the later one is in use.
	Revoked *render.Revocation `json:"by_key_revoked" jsonschema:"nullable"`
	Reason  string             `json:"by_reason"`
	record  approval.Record
}

func (x correctedRecord) words() string {
	text := fmt.Sprintf("; entry %d %s it, signed by %s (%s)", x.Entry, x.How, x.Signer, x.Reason)
	if x.Revoked != nil {
		text += "; ! its " + x.Revoked.Short()
	}
	return x.Record.words() + source.Visible(text)
}

func corrections(line *approval.Line, folder string) []correctedRecord {
	list := []correctedRecord{}
	for _, x := range line.Corrections(folder) {
		list = append(list, correctedRecord{serviceRecordOf(line, history.ServiceOf(line, x.Record)), x.How, x.By.Entry.Seq, x.By.Signer, revocationOf(line, x.By.Fingerprint), x.By.Reason, x.Record})
	}
	return list
}

type serviceFinding struct {
	ID   string `json:"id"`
	Text string `json:"text"`
}

func serviceRecordOf(line *approval.Line, s history.Service) serviceRecord {
	late := ""
	if s.Late {
		late = s.ApprovedAt.UTC().Format(signoff.TimeLayout)
	}
	return serviceRecord{
		Late:  late,
		Entry: s.Entry.Seq, Revision: s.Revision, Folder: s.Folder, Routes: append([]string{}, s.Routes...), Since: s.Since.Format(signoff.TimeLayout),
		Signer: s.Signer, Key: s.Fingerprint, Stated: s.Time.Format(signoff.TimeLayout), Recorded: s.Recorded.Format(signoff.TimeLayout), Reason: s.Reason,
		Revoked: revocationOf(line, s.Fingerprint), Review: byRevoked(evidenceOf(line, s.Folder, s.Content, s.Through)),
		lapsed:   s.Lapsed,
		Approved: s.Approved, Undoes: s.Undoes, Through: append([]int64{}, s.Through...),
	}
}

func (r serviceRecord) words() string {
	where := "the whole network"
	if len(r.Routes) > 0 {
		where = strings.Join(r.Routes, ", ")
	}
	state := "NOT APPROVED"
	switch {
	case r.Undoes:
		state = "approved, but UNDOES what was in service before"
	case r.lapsed:
		state = "approved then, NOT APPROVED ANY MORE"
	case r.Late != "":
		state = "NOT APPROVED THEN, only on " + r.Late
	case r.Approved && len(r.Through) > 0:
		state = fmt.Sprintf("approved by assessment %d", r.Through[0])
	case r.Approved:
		state = "approved, the anchor"
	}
	text := fmt.Sprintf("%s  commit %s on %s; %s; entry %d, signed by %s (%s)", r.Since, short(r.Revision), where, state, r.Entry, r.Signer, r.Reason)
	if r.Revoked != nil {
		text += "; ! its " + r.Revoked.Short()
	}
	for _, e := range r.Review {
		text += "; ! " + e.by() + ": " + e.Revoked.Short()
	}
	return source.Visible(text)
}

func (a *app) inforceLog(ctx context.Context) error {
	folder, err := a.folder()
	if err != nil {
		return err
	}
	l, err := a.openLedger(ctx, false)
	if err != nil {
		return err
	}
	defer l.Close()
	line, problems, err := history.ReadLine(ctx, l)
	if err != nil {
		return err
	}
	records := []serviceRecord{}
	for _, r := range line.Standing(folder) {
		records = append(records, serviceRecordOf(line, history.ServiceOf(line, r)))
	}
	corrected := corrections(line, folder)
	findings := history.ServiceFindings(line, folder)
	for _, p := range problems {
		findings = append(findings, history.ServiceFinding{ID: history.DoesNotCount, Text: p.Error()})
	}
	err = a.write(func(w io.Writer) error {
		if a.format == "json" {
			list := []serviceFinding{}
			for _, f := range findings {
				list = append(list, serviceFinding(f))
			}
			return indentedJSON(w, serviceLog{"speedtrail-inforce 1", records, corrected, list})
		}
		for i, r := range records {
			if i > 0 {
				fmt.Fprintln(w)
			}
			fmt.Fprintf(w, "%s\n", render.Hanging(r.words(), a.style().Width, "  "))
		}
		for _, x := range corrected {
			fmt.Fprintf(w, "\n%s\n", render.Hanging("Not any more: "+x.words(), a.style().Width, "  "))
		}
		if len(records)+len(corrected) > 0 && len(findings) > 0 {
			fmt.Fprintln(w)
		}
		if len(records) == 0 {
			fmt.Fprintf(w, "No revision is recorded as in service. Record one with: speedtrail inforce record REV --since T\n")
		}
		for i, f := range findings {
			fmt.Fprintf(w, "%s\n", render.Hanging("! "+f.ID+": "+source.Visible(f.Text), a.style().Width, "  "))
			if i == len(findings)-1 || findings[i+1].ID != f.ID {
				fmt.Fprintf(w, "  %s\n", render.Hanging(serviceAdvice[f.ID], a.style().Width, "  "))
			}
		}
		return nil
	})
	if err == nil && len(findings) > 0 {
		return errFindings
	}
	return err
}
