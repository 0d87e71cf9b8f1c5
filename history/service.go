package history

import (
	"fmt"
	"slices"
	"strings"
	"time"

	"speedtrail/history/approval"
)

// Service is a record that a revision went into service, and how it got there.
type Service struct {
	approval.Record
	Before *approval.Record // what was in service before; nil for the first
	// Approved: approved assessments lead to the revision from the anchor, and
	// from what was in service before, on every route that the record names.
	Approved bool
	// Undoes: the revision is approved, but not by a way from what was in service
	// before: of two approved siblings the second undoes the first.
	Undoes bool
	// Late: it is approved but was not when it went into service, or not by a way from
	// what was in service before. Neither later signatures nor later records of what was
	// in service before, by which it Undoes that, take it away.
	Late       bool
	ApprovedAt time.Time
	// Lapsed: it was approved when it went into service, and is not any more.
	Lapsed bool
	// Rejected are the rejections of it that stand.
	Rejected []approval.Record
	// Through are the approved assessments whose target it is.
	Through []int64
}

// ServiceOf describes an in-force record.
func ServiceOf(line *approval.Line, r approval.Record) Service {
	s := Service{Record: r, Approved: line.ApprovedContent(r.Folder, r.Content), Rejected: line.Rejections(r.Folder, r.Content)}
	befores := beforeRecords(line.Standing(r.Folder), r)
	for _, before := range befores {
		undone := s.Approved && !line.Led(r.Folder, before.Content, r.Content)
		if s.Before == nil || undone && !s.Undoes {
			s.Before = before
		}
		s.Undoes = s.Undoes || undone
	}
	if s.Undoes {
		s.Approved = false
	}
	approved := func(l *approval.Line) bool {
		return l.ApprovedContent(r.Folder, r.Content) &&
			!slices.ContainsFunc(befores, func(b *approval.Record) bool { return !l.Led(r.Folder, b.Content, r.Content) })
	}
	if s.Undoes {
		approved = func(l *approval.Line) bool { return l.ApprovedContent(r.Folder, r.Content) }
	}
	if then := approved(line.AsOf(r.Since)); (s.Approved || s.Undoes) && !then {
		s.Late = true
		s.ApprovedAt, _ = line.Since(r.Folder, approved)
	}
	s.Lapsed = !s.Approved && !s.Undoes && approved(line.AsOf(r.Since))
	for _, a := range line.Assessments() {
		if a.Folder == r.Folder && a.TargetTree == r.Content && line.State(a.Number).Word == approval.Approved {
			s.Through = append(s.Through, a.Number)
		}
	}
	return s
}

// beforeRecords finds the records of a list, by instant, that were in force just
// before another one, on each route that it names.
func beforeRecords(standing []approval.Record, r approval.Record) (befores []*approval.Record) {
	routes := r.Routes
	if len(routes) == 0 {
		// The whole network: each route that a record names, and all others.
		routes = []string{""}
		for _, x := range standing {
			for _, id := range x.Routes {
				if !slices.Contains(routes, id) {
					routes = append(routes, id)
				}
			}
		}
	}
	for _, route := range routes {
		if before := beforeRecord(standing, r, route); before != nil {
			befores = append(befores, before)
		}
	}
	return befores
}

// beforeRecord finds the record that was in force on a route just before another;
// nil where there was none. An empty route stands for those that no record names.
func beforeRecord(standing []approval.Record, r approval.Record, route string) (before *approval.Record) {
	for i := range standing {
		x := &standing[i]
		if x.Entry.Seq == r.Entry.Seq || !x.Since.Before(r.Since) {
			continue
		}
		if len(x.Routes) == 0 || slices.Contains(x.Routes, route) {
			before = x
		}
	}
	return before
}

// ServiceFinding is something about the in-force log that needs eyes.
type ServiceFinding struct {
	ID, Text string
}

// The ids of these findings.
const (
	ServiceUnapproved = "in-service-unapproved"
	ServiceUndoes     = "in-service-undoes"
	ServiceCorrected  = "in-service-corrected"
	NeverInService    = "approved-never-in-service"
	// DoesNotCount is an entry that ReadLine has left out, of whichever folder: what
	// is in service may not be what somebody recorded.
	DoesNotCount = "does-not-count"
)

// ServiceFindings looks at the in-force log of a folder: revisions in service
// without approval, also by records that do not stand any more, and approved ones
// that went into service neither by themselves nor as a part of a later one.
func ServiceFindings(line *approval.Line, folder string) []ServiceFinding {
	var list []ServiceFinding
	served := map[string]bool{}
	if a := line.Anchor(folder); a != nil {
		served[a.Content] = true
	}
	for _, r := range line.Standing(folder) {
		served[r.Content] = true
		s := ServiceOf(line, r)
		where := "the whole network"
		if len(r.Routes) > 0 {
			where = strings.Join(r.Routes, ", ")
		}
		at := r.Since.UTC().Format(time.RFC3339)
		if s.Undoes {
			list = append(list, ServiceFinding{ServiceUndoes, fmt.Sprintf("entry %d: commit %s went into service on %s from %s and is approved, but no approved assessment leads to it from commit %s, which was in service before: what that one changed can be undone", r.Entry.Seq, r.Revision, where, at, s.Before.Revision)})
		}
		switch {
		case s.Late:
			list = append(list, ServiceFinding{ServiceUnapproved, fmt.Sprintf("entry %d: commit %s went into service on %s from %s and was approved only on %s", r.Entry.Seq, r.Revision, where, at, s.ApprovedAt.UTC().Format(time.RFC3339))})
		case s.Lapsed:
			list = append(list, ServiceFinding{ServiceUnapproved, fmt.Sprintf("entry %d: commit %s went into service on %s from %s and was approved then; it is not any more%s", r.Entry.Seq, r.Revision, where, at, rejectedWords(s.Rejected))})
		case !s.Approved && !s.Undoes:
			list = append(list, ServiceFinding{ServiceUnapproved, fmt.Sprintf("entry %d: commit %s went into service on %s from %s without approval%s", r.Entry.Seq, r.Revision, where, at, rejectedWords(s.Rejected))})
		}
	}
	// Whoever may record what is in service does not make unapproved service go away by
	// taking the record back.
	for _, x := range line.Corrections(folder) {
		if wrong := wrongThen(line, x); wrong != "" {
			list = append(list, ServiceFinding{ServiceCorrected, fmt.Sprintf("entry %d said that commit %s, %s went into service from %s; entry %d %s it (%s: %s)",
				x.Record.Entry.Seq, x.Record.Revision, wrong, x.Record.Since.UTC().Format(time.RFC3339), x.By.Entry.Seq, x.How, x.By.Signer, x.By.Reason)})
		}
	}
	// What approved assessments lead on from to something that went into service on the
	// whole network later went with it, as a part of the next release does.
	followed := func(a *approval.Assessment) bool {
		return slices.ContainsFunc(line.Standing(folder), func(r approval.Record) bool {
			return len(r.Routes) == 0 && r.Entry.Seq > a.Entry.Seq && line.Led(folder, a.TargetTree, r.Content)
		})
	}
	for _, a := range line.Assessments() {
		if a.Folder == folder && !served[a.TargetTree] && line.State(a.Number).Word == approval.Approved && !followed(a) {
			served[a.TargetTree] = true
			list = append(list, ServiceFinding{NeverInService, fmt.Sprintf("assessment %d: its target %s is approved and never went into service", a.Number, a.Target)})
		}
	}
	return list
}

// rejectedWords says who has rejected what is in service: that is more than that
// nobody has looked at it.
func rejectedWords(list []approval.Record) string {
	text := ""
	for _, r := range list {
		text += fmt.Sprintf("; %s rejected it: %s", r.Signer, r.Reason)
	}
	return text
}

// wrongThen says what was wrong with a record that does not stand any more, beside
// those that stood until it was corrected; empty where nothing was.
func wrongThen(line *approval.Line, x approval.Correction) string {
	then, r := line.AsOf(x.Record.Since), x.Record
	if !then.ApprovedContent(r.Folder, r.Content) {
		return "which was not approved then,"
	}
	for _, before := range beforeRecords(line.StandingBefore(r.Folder, x.By.Entry.Seq), r) {
		if !then.Led(r.Folder, before.Content, r.Content) {
			return fmt.Sprintf("to which no approved assessment led then from commit %s, which was in service before,", before.Revision)
		}
	}
	return ""
}
