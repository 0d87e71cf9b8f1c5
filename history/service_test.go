package history_test

import (
	"fmt"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"speedtrail/history"
	"speedtrail/history/approval"
	"speedtrail/history/assessment"
	"speedtrail/history/chain"
	"speedtrail/history/signoff"
)

// services gives the records in force that stand, by their entry, and what is
// found about them.
func (w *writer) services() (map[int64]history.Service, []history.ServiceFinding) {
	w.t.Helper()
	line, problems, err := history.ReadLine(w.t.Context(), w.l)
	if err != nil || len(problems) > 0 {
		w.t.Fatal(problems, err)
	}
	out := map[int64]history.Service{}
	for _, r := range line.Standing(".") {
		out[r.Entry.Seq] = history.ServiceOf(line, r)
	}
	return out, history.ServiceFindings(line, ".")
}

func (w *writer) approve(base, target, checker string) int64 {
	w.t.Helper()
	n := w.assess(base, target)
	w.signOff(n, checker, "checker", signoff.Approve)
	w.signOff(n, "bea", "approver", signoff.Approve)
	return n
}

func (w *writer) inService(c, since, routes string) int64 {
	w.t.Helper()
	line, _, err := history.ReadLine(w.t.Context(), w.l)
	if err != nil {
		w.t.Fatal(err)
	}
	policy := "P1"
	if line.Newest(".").Hash == policyHash("P2") {
		policy = "P2"
	}
	w.inForce(c, policy, since, routes, approval.CorrectsNothing)
	return w.head.Seq
}

func ids(list []history.ServiceFinding) []string {
	var out []string
	for _, f := range list {
		out = append(out, f.ID)
	}
	return out
}

// The whole way: what is approved goes into service in its order.
func TestService(t *testing.T) {
	w := newLedger(t, filepath.Join(quickDir(t), "ledger.db"))
	w.anchor("a")
	one := w.approve("a", "b", "ada")
	two := w.approve("b", "c", "ada")
	first := w.inService("a", "2026-03-01T03:00:00Z", "all")
	second := w.inService("c", "2026-03-02T03:00:00Z", "all")
	s, findings := w.services()
	if got := s[first]; !got.Approved || got.Undoes || got.Before != nil || len(got.Through) != 0 {
		t.Errorf("the anchor in service: %+v", got)
	}
	if got := s[second]; !got.Approved || got.Undoes || got.Before == nil || got.Before.Entry.Seq != first || !slices.Equal(got.Through, []int64{two}) {
		t.Errorf("c in service: %+v", got)
	}
	// b was left out, and went into service as a part of c.
	if len(findings) > 0 || s[second].Through[0] == one {
		t.Errorf("%v", findings)
	}
}

// A release that was taken back, and never ran, did not go into service with what was
// there before it.
func TestServiceOfWhatWasTakenBack(t *testing.T) {
	w := newLedger(t, filepath.Join(quickDir(t), "ledger.db"))
	w.anchor("a")
	w.inService("a", "2026-03-01T03:00:00Z", "all")
	w.approve("a", "b", "ada")
	w.approve("b", "r", "ada")
	if _, findings := w.services(); !slices.Equal(ids(findings), []string{history.NeverInService}) {
		t.Errorf("%v", findings)
	}
}

// What goes into service on one route takes nothing of the network along.
func TestServiceOfOneRoute(t *testing.T) {
	w := newLedger(t, filepath.Join(quickDir(t), "ledger.db"))
	w.anchor("a")
	w.approve("a", "b", "ada")
	w.approve("b", "c", "ada")
	w.inService("c", "2026-03-02T03:00:00Z", "r1")
	if _, findings := w.services(); !slices.Equal(ids(findings), []string{history.NeverInService}) {
		t.Errorf("%v", findings)
	}
}

// Of two approved siblings the second undoes the first.
func TestServiceOfSiblings(t *testing.T) {
	w := newLedger(t, filepath.Join(quickDir(t), "ledger.db"))
	w.anchor("a")
	w.approve("a", "b", "ada")
	w.approve("b", "c", "ada")
	w.approve("c", "d", "ada2")
	w.approve("c", "f", "ada2")
	w.inService("c", "2026-03-01T03:00:00Z", "all")
	d := w.inService("d", "2026-03-02T03:00:00Z", "all")
	f := w.inService("f", "2026-03-03T03:00:00Z", "all")
	s, findings := w.services()
	if got := s[d]; !got.Approved || got.Undoes {
		t.Errorf("the first sibling: %+v", got)
	}
	if got := s[f]; got.Approved || !got.Undoes || got.Before.Entry.Seq != d {
		t.Errorf("the second sibling: %+v", got)
	}
	if !slices.Contains(ids(findings), history.ServiceUndoes) {
		t.Errorf("%v", findings)
	}
	// Back to what was in service before is a way that nobody approved, too.
	back := w.inService("c", "2026-03-04T03:00:00Z", "all")
	s, _ = w.services()
	if got := s[back]; got.Approved || !got.Undoes {
		t.Errorf("back: %+v", got)
	}
}

// On different routes two siblings do not meet.
func TestServiceOfSiblingsOnOtherRoutes(t *testing.T) {
	w := newLedger(t, filepath.Join(quickDir(t), "ledger.db"))
	w.anchor("a")
	w.approve("a", "b", "ada")
	w.approve("b", "c", "ada")
	w.approve("c", "d", "ada2")
	w.approve("c", "f", "ada2")
	w.inService("c", "2026-03-01T03:00:00Z", "all")
	d := w.inService("d", "2026-03-02T03:00:00Z", "R1")
	f := w.inService("f", "2026-03-03T03:00:00Z", "R2,R3")
	both := w.inService("f", "2026-03-04T03:00:00Z", "R1")
	s, _ := w.services()
	for entry, undoes := range map[int64]bool{d: false, f: false, both: true} {
		if got := s[entry]; got.Undoes != undoes || got.Approved == undoes {
			t.Errorf("entry %d: undoes is %v", entry, got.Undoes)
		}
	}
}

// A record for the whole network is held against what was in service on each
// route, not only against the newest record: f undoes d on R1.
func TestServiceOfTheWholeNetwork(t *testing.T) {
	w := newLedger(t, filepath.Join(quickDir(t), "ledger.db"))
	w.anchor("a")
	w.approve("a", "b", "ada")
	w.approve("b", "c", "ada")
	w.approve("c", "d", "ada2")
	w.approve("c", "f", "ada2")
	w.inService("c", "2026-03-01T03:00:00Z", "all")
	w.inService("d", "2026-03-02T03:00:00Z", "R1")
	w.inService("f", "2026-03-03T03:00:00Z", "R2")
	whole := w.inService("f", "2026-03-04T03:00:00Z", "all")
	s, findings := w.services()
	if got := s[whole]; !got.Undoes || got.Approved {
		t.Error("a record for the whole network is held against the newest record alone, so that what it undoes on another route is not found: ", findings)
	}
	// Of several that were in service before, the one is named that is undone.
	if got := s[whole].Before; got.Revision != commitOf("d") {
		t.Errorf("%s was in service before, want d", got.Revision)
	}
}

// Of several siblings that a record undoes, the first by route is named.
func TestServiceUndoesTwo(t *testing.T) {
	w := newLedger(t, filepath.Join(quickDir(t), "ledger.db"))
	w.anchor("a")
	w.approve("a", "b", "ada")
	w.approve("b", "c", "ada")
	w.approve("c", "d", "ada2")
	w.approve("c", "f", "ada2")
	w.approve("c", "i", "ada2")
	w.inService("f", "2026-03-02T03:00:00Z", "R1")
	w.inService("d", "2026-03-03T03:00:00Z", "R2")
	both := w.inService("i", "2026-03-04T03:00:00Z", "R1,R2")
	if s, _ := w.services(); !s[both].Undoes || s[both].Before.Revision != commitOf("f") {
		t.Errorf("%+v", s[both])
	}
}

// What nobody approved is found, and so is a record that hides behind one of its
// routes.
func TestServiceWithoutApproval(t *testing.T) {
	w := newLedger(t, filepath.Join(quickDir(t), "ledger.db"))
	w.anchor("a")
	n := w.assess("a", "b")
	w.signOff(n, "ada", "checker", signoff.Approve)
	first := w.inService("a", "2026-03-01T03:00:00Z", "all")
	open := w.inService("b", "2026-03-02T03:00:00Z", "all")
	strange := w.inService("x", "2026-03-03T03:00:00Z", "R1")
	s, findings := w.services()
	for entry, approved := range map[int64]bool{first: true, open: false, strange: false} {
		if got := s[entry]; got.Approved != approved || got.Undoes {
			t.Errorf("entry %d: approved is %v, undoes %v", entry, got.Approved, got.Undoes)
		}
	}
	if !slices.Equal(ids(findings), []string{history.ServiceUnapproved, history.ServiceUnapproved}) {
		t.Errorf("%v", findings)
	}
	// Approved afterwards, it is in order, for the state of today decides.
	w.signOff(n, "bea", "approver", signoff.Approve)
	if s, _ := w.services(); !s[open].Approved || !slices.Equal(s[open].Through, []int64{n}) {
		t.Errorf("%+v", s[open])
	}
	w.signOff(n, "bea", "approver", signoff.Reject)
	if s, _ := w.services(); s[open].Approved {
		t.Error("a rejected revision is approved in service")
	}
}

// What a later signature allows was not allowed when it went into service: the
// record of that stays.
func TestServiceBeforeItsApproval(t *testing.T) {
	t.Run("rejected in between", func(t *testing.T) {
		w := newLedger(t, filepath.Join(quickDir(t), "ledger.db"))
		w.anchor("a")
		n := w.approve("a", "b", "ada")
		w.signOff(n, "cem", "checker", signoff.Reject)
		entry := w.inService("b", clock(w.head.Seq+1).Format(time.RFC3339), "all")
		if s, findings := w.services(); s[entry].Approved || !slices.Equal(ids(findings), []string{history.ServiceUnapproved}) {
			t.Errorf("rejected: %+v, %v", s[entry], findings)
		} else if r := s[entry].Rejected; len(r) != 1 || !strings.HasSuffix(findings[0].Text, "; "+r[0].Signer+" rejected it: "+r[0].Reason) {
			t.Errorf("nobody is named who rejected it: %+v, %v", r, findings)
		}
		w.signOff(n, "cem", "checker", signoff.Approve)
		s, findings := w.services()
		if got := s[entry]; !got.Approved || !got.Late || !got.ApprovedAt.Equal(clock(w.head.Seq)) || !slices.Equal(ids(findings), []string{history.ServiceUnapproved}) {
			t.Errorf("approved again: %+v, %v", got, findings)
		}
	})
	t.Run("undone, and led to later", func(t *testing.T) {
		w := newLedger(t, filepath.Join(quickDir(t), "ledger.db"))
		w.anchor("a")
		w.approve("a", "b", "cem")
		w.approve("b", "c", "cem")
		w.approve("b", "d", "cem")
		w.inService("c", clock(w.head.Seq+1).Format(time.RFC3339), "all")
		entry := w.inService("d", clock(w.head.Seq+1).Format(time.RFC3339), "all")
		// Approved all the while, it is neither late nor has it lapsed.
		if s, findings := w.services(); !s[entry].Undoes || s[entry].Late || s[entry].Lapsed || !slices.Equal(ids(findings), []string{history.ServiceUndoes}) {
			t.Errorf("undoes c: %+v, %v", s[entry], findings)
		}
		w.approve("c", "d", "cem")
		s, findings := w.services()
		if got := s[entry]; !got.Approved || !got.Late || !got.ApprovedAt.Equal(clock(w.head.Seq)) || !slices.Contains(ids(findings), history.ServiceUnapproved) {
			t.Errorf("led to from c: %+v, %v", got, findings)
		}
	})
	t.Run("rejected since", func(t *testing.T) {
		w := newLedger(t, filepath.Join(quickDir(t), "ledger.db"))
		w.anchor("a")
		n := w.approve("a", "b", "ada")
		entry := w.inService("b", clock(w.head.Seq+1).Format(time.RFC3339), "all")
		w.signOff(n, "ada", "checker", signoff.Reject)
		s, findings := w.services()
		if got := s[entry]; got.Approved || !got.Lapsed || len(findings) != 1 || findings[0].ID != history.ServiceUnapproved || !strings.Contains(findings[0].Text, "was approved then; it is not any more") {
			t.Errorf("%+v, %v", got, findings)
		}
	})
	t.Run("hidden by a record of something before it", func(t *testing.T) {
		w := newLedger(t, filepath.Join(quickDir(t), "ledger.db"))
		w.anchor("a")
		since := clock(w.head.Seq + 1)
		entry := w.inService("b", since.Format(time.RFC3339), "all")
		w.approve("a", "b", "cem")
		if s, findings := w.services(); !s[entry].Late || !slices.Contains(ids(findings), history.ServiceUnapproved) {
			t.Fatalf("late: %+v, %v", s[entry], findings)
		}
		// Whoever records what is in service, alone, says that x ran before.
		w.inService("x", since.Add(-time.Second).Format(time.RFC3339), "all")
		s, findings := w.services()
		got := 0
		for _, f := range findings {
			if strings.Contains(f.Text, fmt.Sprintf("entry %d: ", entry)) && (f.ID == history.ServiceUndoes || f.ID == history.ServiceUnapproved && strings.Contains(f.Text, "approved only on")) {
				got++
			}
		}
		if !s[entry].Undoes || !s[entry].Late || got != 2 {
			t.Errorf("%+v, %v", s[entry], findings)
		}
	})
	t.Run("in time", func(t *testing.T) {
		w := newLedger(t, filepath.Join(quickDir(t), "ledger.db"))
		w.anchor("a")
		w.approve("a", "b", "ada")
		entry := w.inService("b", clock(w.head.Seq+1).Format(time.RFC3339), "all")
		if s, findings := w.services(); !s[entry].Approved || s[entry].Late || len(findings) > 0 {
			t.Errorf("%+v, %v", s[entry], findings)
		}
	})
}

// Whoever may record what is in service cannot make an unapproved revision vanish
// from the log by taking the record back; a record of an approved one may go.
func TestServiceCorrected(t *testing.T) {
	w := newLedger(t, filepath.Join(quickDir(t), "ledger.db"))
	w.anchor("a")
	w.approve("a", "b", "ada")
	w.inService("a", "2026-03-01T03:00:00Z", "all")
	approved := w.inService("b", "2026-03-02T03:00:00Z", "all")
	w.inForce("b", "P1", "2026-03-03T03:00:00Z", "all", fmt.Sprintf("%s %d", approval.Replaces, approved))
	if _, findings := w.services(); len(findings) > 0 {
		t.Errorf("an approved revision whose instant is corrected: %v", findings)
	}
	then := clock(w.head.Seq + 1).Format(time.RFC3339)
	unapproved := w.inService("c", then, "all")
	w.inForce("a", "P1", then, "all", fmt.Sprintf("%s %d", approval.Voids, unapproved))
	s, findings := w.services()
	if _, stands := s[unapproved]; stands || !slices.Equal(ids(findings), []string{history.ServiceCorrected}) {
		t.Fatalf("%v, %v", s, findings)
	}
	if want := fmt.Sprintf("entry %d said that commit ", unapproved); !strings.HasPrefix(findings[0].Text, want) || !strings.Contains(findings[0].Text, fmt.Sprintf("; entry %d voids it (", unapproved+1)) {
		t.Errorf("%s", findings[0].Text)
	}
	// A later approval does not alter what was so then.
	w.approve("b", "c", "ada")
	if _, findings := w.services(); !slices.Contains(ids(findings), history.ServiceCorrected) {
		t.Errorf("after a later approval: %v", findings)
	}
}

// That of two siblings the second undid the first does not go away by taking the
// record back.
func TestUndoingRecordTakenBack(t *testing.T) {
	for name, corrects := range map[string]string{"voided": approval.Voids, "replaced": approval.Replaces} {
		t.Run(name, func(t *testing.T) {
			w := newLedger(t, filepath.Join(quickDir(t), "ledger.db"))
			w.anchor("a")
			w.approve("a", "b", "ada")
			w.approve("b", "c", "ada")
			w.approve("c", "d", "ada2")
			w.approve("c", "f", "ada2")
			w.inService("c", "2026-03-01T03:00:00Z", "all")
			d := w.inService("d", "2026-03-02T03:00:00Z", "all")
			f := w.inService("f", "2026-03-03T03:00:00Z", "R1")
			_, findings := w.services()
			if !slices.Contains(ids(findings), history.ServiceUndoes) {
				t.Fatal(findings)
			}
			w.inForce("d", "P2", "2026-03-03T03:00:00Z", "R1", fmt.Sprintf("%s %d", corrects, f))
			// Nor by taking back, after that, what it undid.
			w.inForce("d", "P2", "2026-03-02T03:00:00Z", "all", fmt.Sprintf("%s %d", approval.Voids, d))
			_, findings = w.services()
			var texts []string
			for _, x := range findings {
				if x.ID == history.ServiceCorrected {
					texts = append(texts, x.Text)
				}
			}
			if len(texts) != 1 || !strings.Contains(texts[0], fmt.Sprintf("entry %d said that commit %s, to which no approved assessment led then from commit %s", f, commitOf("f"), commitOf("d"))) {
				t.Errorf("%v", findings)
			}
		})
	}
}

// The time of an assessment is signed by nobody: one that is said to be of a far year
// does not make everything late that is signed after it.
func TestAssessmentFromTheFuture(t *testing.T) {
	w := newLedger(t, filepath.Join(quickDir(t), "ledger.db"))
	w.anchor("a")
	d := w.repo.document("a", "e")
	body, digest := encoded(d)
	in, err := w.l.RecordAssessment(t.Context(), begin.AddDate(70, 0, 0), assessment.LedgerRecord(d, body, digest))
	if err != nil {
		t.Fatal(err)
	}
	w.head = in.Head
	w.approve("a", "b", "ada")
	entry := w.inService("b", "2026-04-02T03:00:00Z", "all")
	s, findings := w.services()
	if got := s[entry]; !got.Approved || got.Late || len(findings) > 0 {
		t.Errorf("approved %t, late %t: %v", got.Approved, got.Late, findings)
	}
}

// A clock of a signer that is a little ahead makes nothing late that others sign.
func TestStatementOfClockAhead(t *testing.T) {
	w := newLedger(t, filepath.Join(quickDir(t), "ledger.db"))
	w.anchor("a")
	n := w.assess("a", "b")
	recorded := w.now()
	w.record(chain.InForce, signoff.Statement{Kind: signoff.InForce, Revision: commitOf("a"), Content: treeOf("a"), Policy: policyHash("P1"), Since: begin,
		Corrects: approval.CorrectsNothing, Role: approval.InServiceRole, Time: recorded.Add(4 * time.Minute)}, "cem")
	line := func() *approval.Line {
		line, _, err := history.ReadLine(t.Context(), w.l)
		if err != nil {
			t.Fatal(err)
		}
		return line
	}
	for _, x := range [][2]string{{"ada", "checker"}, {"bea", "approver"}} {
		at := recorded.Add(time.Minute)
		text, signature, err := sign(signOffOf(line().Assessment(n), x[1], signoff.Approve), x[0], w.head, at)
		if err != nil {
			t.Fatal(err)
		}
		if w.head, err = history.RecordSigned(t.Context(), w.l, nil, history.Statement{Kind: chain.SignOff, Text: text, Signature: signature}, at); err != nil {
			t.Fatal(err)
		}
	}
	for minutes, want := range map[time.Duration]bool{0: false, 2: true} {
		if got := line().AsOf(recorded.Add(minutes*time.Minute)).ApprovedContent(".", treeOf("b")); got != want {
			t.Errorf("%d minutes after: approved is %v", minutes, got)
		}
	}
}

// A late approval is not made an early one by recording it with a clock that was put
// back: it stands after the statement of what went into service.
func TestLateApprovalByAnotherClock(t *testing.T) {
	w := newLedger(t, filepath.Join(quickDir(t), "ledger.db"))
	w.anchor("a")
	n := w.assess("a", "b")
	assessed, early := w.head, w.now().Add(-30*time.Minute)
	entry := w.inService("b", early.Add(10*time.Minute).Format(time.RFC3339), "all")
	for _, x := range [][2]string{{"ada", "checker"}, {"bea", "approver"}} {
		line, _, err := history.ReadLine(t.Context(), w.l)
		if err != nil {
			t.Fatal(err)
		}
		text, signature, err := sign(signOffOf(line.Assessment(n), x[1], signoff.Approve), x[0], assessed, early)
		if err != nil {
			t.Fatal(err)
		}
		if w.head, err = history.RecordSigned(t.Context(), w.l, nil, history.Statement{Kind: chain.SignOff, Text: text, Signature: signature}, early); err != nil {
			t.Fatal(err)
		}
	}
	s, findings := w.services()
	if got := s[entry]; !got.Late || !slices.Equal(ids(findings), []string{history.ServiceUnapproved}) {
		t.Errorf("approved %t, late %t: %v", got.Approved, got.Late, findings)
	}
}
