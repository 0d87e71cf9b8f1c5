package approval

import (
	"errors"
	"strings"
	"testing"
	"time"

	"speedtrail/history/chain"
	"speedtrail/history/signoff"
)

// A release that was never approved, as nobody knows who prepared it, asks nothing of
// others: nobody rejected it, and its policy was never in force.
func TestNeverApprovedAsksNothing(t *testing.T) {
	s := anchored(t, ordinary())
	never := s.assess("a", "b", ordinary(), ordinary().without("eva"), func(a *Assessment) { a.Preparers = []string{"nobody@else.example"} })
	s.must(s.signOff(never, "ada", "checker", "approve"))
	s.must(s.signOff(never, "bea", "approver", "approve"))
	s.state(never, Partly)
	other := s.assess("a", "c", ordinary(), ordinary(), nil)
	s.must(s.signOff(other, "eva", "checker", "approve"))
	s.must(s.signOff(other, "bea", "approver", "approve"))
	s.state(other, Approved)
}

// Two rejections one after the other bring no more back than one: the policies that
// they take out of force all ask on.
func TestTwoRejectionsLoosenNothing(t *testing.T) {
	s := anchored(t, ordinary())
	strict, lax := ordinary().role("approver 2 preparer,checker"), ordinary().key("ada2")
	two := s.assess("a", "b", ordinary(), strict, nil)
	s.approve(two)
	three := s.assess("b", "c", strict, lax, nil)
	s.must(s.signOff(three, "fin", "approver", "approve"))
	s.approve(three)
	s.must(s.signOff(three, "ada", "checker", "reject"))
	s.must(s.signOff(two, "fin", "checker", "reject"))
	other := s.assess("a", "d", ordinary(), ordinary(), nil)
	s.must(s.signOff(other, "ada", "checker", "approve"))
	s.must(s.signOff(other, "bea", "approver", "approve"))
	if got := s.state(other, Partly); strings.Join(got.Missing, ", ") != "approver (1 of 2)" {
		t.Errorf("missing are %v", got.Missing)
	}
	s.must(s.signOff(other, "fin", "approver", "approve"))
	s.state(other, Approved)
}

// What was rejected before a policy became stricter is not approved by the former one
// once that is rejected in its turn: only what led to the rejected release is.
func TestClearedAfterRejectedPolicy(t *testing.T) {
	s := anchored(t, ordinary())
	strict := ordinary().role("approver 2 preparer,checker")
	first := s.assess("a", "b", ordinary(), ordinary(), nil)
	s.approve(first)
	other := s.assess("a", "d", ordinary(), ordinary(), nil)
	s.approve(other)
	s.must(s.signOff(other, "fin", "checker", "reject"))
	turn := s.assess("b", "c", ordinary(), strict, nil)
	s.approve(turn)
	s.must(s.signOff(turn, "fin", "checker", "reject"))
	s.must(s.signOff(other, "fin", "checker", "approve"))
	s.state(other, Partly)
	s.must(s.signOff(first, "eva", "checker", "reject"))
	s.must(s.signOff(first, "eva", "checker", "approve"))
	s.state(first, Approved)
	s.must(s.signOff(turn, "fin", "checker", "approve"))
	s.state(turn, Approved)
}

// A key stays out where the release that took it out is rejected while a later one,
// which never had to do with the key, is in force; a newer policy can bring it back.
func TestRejectionBesideALaterTurn(t *testing.T) {
	s := anchored(t, ordinary())
	later := ordinary().key("ada2")
	out := s.assess("a", "b", ordinary(), ordinary().without("eva"), nil)
	beside := s.assess("a", "c", ordinary(), later, nil)
	s.approve(out)
	s.approve(beside)
	other := s.assess("c", "d", later, later, nil)
	s.must(s.signOff(out, "fin", "checker", "reject"))
	s.refused(s.signOff(other, "eva", "checker", "approve"), "was taken out of the policy by assessment 1, which was approved until entry 10 rejected it")
	s.refused(s.signOff(other, "eva", "checker", "reject"), "which was approved until entry 10 rejected it")
	s.rules = later
	s.refused(s.revoke("ada", "eva", "checker"), "which was approved until entry 10 rejected it")
	s.approve(s.assess("c", "e", later, later.key("bea2"), nil))
	s.must(s.signOff(other, "eva", "checker", "approve"))
}

// Nor does a rejection bring back who may record what is in service, or revoke.
func TestRejectionBringsNoRecorderBack(t *testing.T) {
	s := anchored(t, ordinary().role("in-service 1 - cem,eva"))
	strict := s.rules.role("in-service 1 - cem").role("checker 1 preparer ada,fin").role("approver 1 preparer,checker bea")
	turn := s.assess("a", "b", s.rules, strict, nil)
	s.approve(turn)
	s.must(s.signOff(turn, "fin", "checker", "reject"))
	st := &signoff.Statement{Kind: signoff.InForce, Revision: commitOf("a"), Content: treeOf("a"), Policy: s.rules.hash(), Since: day(2), Corrects: CorrectsNothing, Role: InServiceRole}
	s.refused(s.record(chain.InForce, s.sign(st, "eva", InForceFormat)), "by "+whoseRejected+": eva@tarn.example is no signer of the role in-service")
	s.refused(s.revoke("ada", "eva", "checker"), "by "+whoseRejected+": eva@tarn.example is no signer of the role checker")
	s.must(s.revoke("eva", "eva", signoff.Owner))
	s.must(s.inForce("a", day(2), "all", CorrectsNothing))
}

// Who rejects the release that gave others new keys keeps them from signing, and what
// they are told says whom to ask.
func TestRejectedRotation(t *testing.T) {
	s := anchored(t, ordinary())
	turn := s.assess("a", "b", ordinary(), ordinary().without("ada").key("ada2"), nil)
	s.approve(turn)
	s.must(s.signOff(turn, "fin", "checker", "reject"))
	other := s.assess("a", "c", ordinary(), ordinary(), nil)
	err := s.signOff(other, "ada", "checker", "approve")
	s.refused(err, "by "+whoseRejected)
	var hint interface{ Hint() string }
	if !errors.As(err, &hint) || !strings.Contains(hint.Hint(), "assessment 1 asks on, though entry 6 rejected it") {
		t.Errorf("no hint, or another one: %v", err)
	}
	s.must(s.signOff(turn, "fin", "checker", "approve"))
	s.must(s.signOff(s.assess("b", "d", ordinary().without("ada").key("ada2"), ordinary().without("ada").key("ada2"), nil), "ada2", "checker", "approve"))
}

// What led to a release that took a key out was decided on before, and may be so again
// with that key after the release was rejected.
func TestRejectedReleaseLeavesItsWayAlone(t *testing.T) {
	s := anchored(t, ordinary())
	first := s.assess("a", "b", ordinary(), ordinary(), nil)
	s.approve(first)
	out := s.assess("b", "c", ordinary(), ordinary().without("eva"), nil)
	s.approve(out)
	s.refused(s.signOff(first, "eva", "checker", "approve"), "by the newest approved policy")
	s.must(s.signOff(out, "fin", "checker", "reject"))
	s.must(s.signOff(first, "eva", "checker", "approve"))
	s.refused(s.signOff(s.assess("a", "d", ordinary(), ordinary(), nil), "eva", "checker", "approve"), "by "+whoseRejected)
}

// The policy that was rejected judges the recording as well as the time that a signer
// states, and what it lets a role do.
func TestRejectedPolicyJudgesTheRecording(t *testing.T) {
	s := anchored(t, ordinary())
	strict := ordinary().role("approver 1 checker").key(`cem valid-before="20260301133000Z"`)
	turn := s.assess("a", "b", ordinary(), strict, nil)
	s.approve(turn)
	s.must(s.signOff(turn, "fin", "checker", "reject"))
	before := s.now.Add(-time.Hour) // at 13:00, and recorded at 14:00
	s.refused(s.inForce("a", day(2), "all", CorrectsNothing, func(st *signoff.Statement) { st.Time = before }), "by "+whoseRejected+": the key "+fingerprintOf("cem")+" was valid until 2026-03-01T13:30:00Z")
	s.refused(s.revoke("ada", "eva", "approver"), "by "+whoseRejected+": the role approver is not independent of preparer")
	s.must(s.revoke("ada", "eva", "checker"))
}
