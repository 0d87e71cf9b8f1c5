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
every reference train of that revision, temporary restrictions by their validity. Exit
status 1 if that revision went into service without approval, or has lost it.`,
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
	if text == "" {
		return time.Time{}, badCall(option+" T, for example "+option+" 2026-03-14T05:12:00Z", "%s is missing", option)
	}
	t, err := time.Parse(time.RFC3339, text)
	if err != nil {
		return t, badCall("write it as 2026-03-14T05:12:00Z or 2026-03-14T06:12:00+01:00", "%s %q is no date-time with a time zone", option, text)
	}
	return t.UTC(), nil
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
	history.ServiceUnapproved: "Unless it is approved by now, have the data looked at and signed, or take it out of service. That it ran without approval stays on record.",
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
	// Elsewhere is null where no older folder knows the signer without this key.
	Elsewhere *render.Elsewhere `json:"key_elsewhere" jsonschema:"nullable"`
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
	// Rejected are the rejections of it that stand.
	Rejected []evidence `json:"rejected"`
	// Review are the statements by which it is approved whose keys were revoked later, or
	// are not those of their names in an older folder.
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
	// Elsewhere is null where no older folder knows the signer of the later one without
	// its key.
	Elsewhere *render.Elsewhere `json:"by_key_elsewhere" jsonschema:"nullable"`
	// Revoked is null while the key of the later one is in use.
	Revoked *render.Revocation `json:"by_key_revoked" jsonschema:"nullable"`
	Reason  string             `json:"by_reason"`
	record  approval.Record
}

func (x correctedRecord) words(named func(hash string) string) string {
	text := fmt.Sprintf("; entry %d %s it, signed by %s (%s)", x.Entry, x.How, x.Signer, x.Reason)
	if x.Elsewhere != nil {
		text += "; ! " + x.Elsewhere.Short()
	}
	if x.Revoked != nil {
		text += "; ! its " + x.Revoked.Short()
	}
	return x.Record.words(named) + source.Visible(text)
}

func corrections(line *approval.Line, folder string) []correctedRecord {
	list := []correctedRecord{}
	for _, x := range line.Corrections(folder) {
		list = append(list, correctedRecord{serviceRecordOf(line, history.ServiceOf(line, x.Record)), x.How, x.By.Entry.Seq, x.By.Signer, elsewhereOf(line, x.By), revocationOf(line, x.By.Fingerprint), x.By.Reason, x.Record})
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
		Revoked: revocationOf(line, s.Fingerprint), Elsewhere: elsewhereOf(line, s.Record), Review: toBeReviewed(evidenceOf(line, s.Folder, s.Content, s.Through)),
		lapsed:   s.Lapsed,
		Approved: s.Approved, Undoes: s.Undoes, Through: append([]int64{}, s.Through...), Rejected: evidenceOn(line, s.Rejected),
	}
}

// words writes a record; named writes a commit.
func (r serviceRecord) words(named func(hash string) string) string {
	where := "the whole network"
	if len(r.Routes) > 0 {
		where = strings.Join(r.Routes, ", ")
	}
	state := "NOT APPROVED"
	switch {
	case r.Undoes && r.Late != "":
		state = "NOT APPROVED THEN, only on " + r.Late + ", and CAN UNDO what was in service before"
	case r.Undoes:
		state = "approved, but CAN UNDO what was in service before"
	case r.lapsed:
		state = "approved then, NOT APPROVED ANY MORE"
	case r.Late != "":
		state = "NOT APPROVED THEN, only on " + r.Late
	case r.Approved && len(r.Through) > 0:
		state = fmt.Sprintf("approved by assessment %d", r.Through[0])
	case r.Approved:
		state = "approved, the anchor"
	}
	text := fmt.Sprintf("%s  commit %s on %s; %s; entry %d, signed by %s (%s)", r.Since, named(r.Revision), where, state, r.Entry, r.Signer, r.Reason)
	if r.Elsewhere != nil {
		text += "; ! " + r.Elsewhere.Short()
	}
	if r.Revoked != nil {
		text += "; ! its " + r.Revoked.Short()
	}
	for _, e := range r.Rejected {
		text += "; ! REJECTED by " + e.by()
	}
	for _, e := range r.Review {
		text += "; ! " + e.by() + ": " + e.review()
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
			fmt.Fprintf(w, "%s\n", render.Hanging(r.words(a.named), a.style().Width, "  "))
		}
		for _, x := range corrected {
			fmt.Fprintf(w, "\n%s\n", render.Hanging("Not any more: "+x.words(a.named), a.style().Width, "  "))
		}
		if len(records)+len(corrected) > 0 && len(findings) > 0 {
			fmt.Fprintln(w)
		}
		if len(records) == 0 {
			fmt.Fprintln(w, source.Visible(a.advise("No revision is recorded as in service. Record one with: speedtrail inforce record REV --since T")))
		}
		for i, f := range findings {
			fmt.Fprintf(w, "%s\n", render.Hanging("! "+f.ID+": "+source.Visible(f.Text), a.style().Width, "  "))
			if i == len(findings)-1 || findings[i+1].ID != f.ID {
				fmt.Fprintf(w, "  %s\n", render.Hanging(source.Visible(a.advise(serviceAdvice[f.ID])), a.style().Width, "  "))
			}
		}
		return nil
	})
	if err == nil && len(findings) > 0 {
		return errFindings
	}
	return err
}
