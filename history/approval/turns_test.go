package approval

import (
	"testing"

	"speedtrail/history/chain"
	"speedtrail/history/signoff"
)

// Of two releases from one base the policy of the one that was complete last counts,
// whatever their numbers (signoff.md, The line of approval; DEVELOPERS.md, Turns of
// the policy).
func TestTurnsByCompletion(t *testing.T) {
	p1, p2 := ordinary().key("ada2"), ordinary().key("ada3")
	for name, c := range map[string]struct {
		last int
		want rules
	}{"in the order of the numbers": {1, p2}, "against it": {0, p1}} {
		t.Run(name, func(t *testing.T) {
			s := anchored(t, ordinary())
			numbers := [2]int64{s.assess("a", "b", ordinary(), p1, nil), s.assess("a", "c", ordinary(), p2, nil)}
			// Begun in the other order: the last signature that is needed decides.
			s.must(s.signOff(numbers[c.last], "ada", "checker", "approve"))
			s.approve(numbers[1-c.last])
			s.must(s.signOff(numbers[c.last], "bea", "approver", "approve"))
			if got := s.line.Newest(".").Hash; got != c.want.hash() {
				t.Errorf("the newest policy is not that of assessment %d, which was complete last", numbers[c.last])
			}
			// And so it is asked for.
			s.rules = c.want
			s.must(s.inForce("b", day(1), "all", CorrectsNothing))
		})
	}
}

// Who approves once more what stands approved moves nothing: a content stays
// approved by the way that was complete first.
func TestRepeatedApproval(t *testing.T) {
	q, r := ordinary().key("ada2"), ordinary().key("ada3")
	s := anchored(t, ordinary())
	one := s.assess("a", "t", ordinary(), q, nil)
	two := s.assess("a", "b", ordinary(), r, nil)
	s.approve(one)
	s.approve(two)
	three := s.assess("b", "t", r, q, nil) // to what is approved already: no turn
	s.approve(three)
	newest := func(when string) {
		t.Helper()
		if s.line.Newest(".").Hash != r.hash() {
			t.Errorf("%s, the newest policy is not that of assessment %d", when, two)
		}
	}
	newest("before")
	s.must(s.signOff(one, "bea", "approver", "approve"))
	s.must(s.signOff(one, "fin", "approver", "approve"))
	newest("approved again")
	s.must(s.signOff(one, "bea", "approver", "reject"))
	s.must(s.signOff(one, "bea", "approver", "approve"))
	newest("rejected, and approved again")
}

// A release that somebody rejects is not complete, whoever else signs it: its policy
// turns when the rejection is cleared, not before a release that was approved
// meanwhile.
func TestTurnOfWhatIsRejected(t *testing.T) {
	strict, note := ordinary().role("approver 2 preparer,checker"), ordinary().key("ada2")
	s := anchored(t, ordinary())
	one := s.assess("a", "b", ordinary(), strict, nil)
	two := s.assess("a", "c", ordinary(), note, nil)
	s.must(s.signOff(one, "fin", "checker", "reject"))
	s.must(s.signOff(one, "ada", "checker", "approve"))
	s.must(s.signOff(one, "bea", "approver", "approve"))
	s.state(one, Rejected)
	s.approve(two)
	s.must(s.signOff(one, "fin", "checker", "approve"))
	s.state(one, Approved)
	if s.line.Newest(".").Hash != strict.hash() {
		t.Error("the release that came last does not turn the policy")
	}
}

// Whoever rejects a release that made the policy stricter does not bring the former
// policy back for another one.
func TestRejectionLoosensNothing(t *testing.T) {
	for name, c := range map[string]struct {
		strict rules
		sign   func(s *story, n int64) error // what the former policy would allow
		want   string
	}{
		"one person more": {ordinary().role("approver 2 preparer,checker"), func(s *story, n int64) error { return s.signOff(n, "eva", "approver", "approve") }, ""},
		"a key less":      {ordinary().without("eva"), func(s *story, n int64) error { return s.signOff(n, "eva", "approver", "approve") }, "by the policy that was in force until its release was rejected: the key " + fingerprintOf("eva")},
		"a signer less":   {ordinary().role("approver 1 preparer,checker bea"), func(s *story, n int64) error { return s.signOff(n, "eva", "approver", "approve") }, "eva@tarn.example is no signer of the role approver"},
		"a role more":     {ordinary().role("reader 1 -"), func(s *story, n int64) error { return s.signOff(n, "eva", "approver", "approve") }, ""},
	} {
		t.Run(name, func(t *testing.T) {
			s := anchored(t, ordinary())
			turn := s.assess("a", "b", ordinary(), c.strict, nil)
			other := s.assess("a", "c", ordinary(), ordinary(), nil)
			s.must(s.signOff(turn, "fin", "checker", "approve"))
			s.must(s.signOff(turn, "bea", "approver", "approve"))
			s.must(s.signOff(turn, "fin", "checker", "reject"))
			s.state(turn, Rejected)
			s.must(s.signOff(other, "fin", "checker", "approve"))
			if err := c.sign(s, other); c.want == "" {
				s.must(err)
			} else {
				s.refused(err, c.want)
			}
			s.state(other, Partly)
			// Signed as the stricter policy asks, it is approved.
			switch name {
			case "one person more":
				s.must(s.signOff(other, "ada", "approver", "approve"))
			case "a role more":
				s.must(s.signOff(other, "cem", "reader", "approve"))
			}
			s.must(s.signOff(other, "bea", "approver", "approve"))
			s.state(other, Approved)
			// What is taken back comes back by those who had signed it.
			s.must(s.signOff(turn, "fin", "checker", "approve"))
			s.state(turn, Approved)
		})
	}
}

// Nor does a key that it took out record what is in service, or revoke others.
func TestRejectionBringsNoKeyBack(t *testing.T) {
	s := anchored(t, ordinary().role("in-service 1 - cem,eva"))
	turn := s.assess("a", "b", s.rules, s.rules.without("eva"), nil)
	s.approve(turn)
	s.must(s.signOff(turn, "fin", "checker", "reject"))
	st := &signoff.Statement{Kind: signoff.InForce, Revision: commitOf("a"), Content: treeOf("a"), Policy: s.rules.hash(), Since: day(2), Corrects: CorrectsNothing, Role: InServiceRole}
	s.refused(s.record(chain.InForce, s.sign(st, "eva", InForceFormat)), "by the policy that was in force until its release was rejected: the key "+fingerprintOf("eva"))
	s.refused(s.revoke("ada", "eva", "checker"), "by the policy that was in force until its release was rejected")
	s.must(s.inForce("a", day(2), "all", CorrectsNothing))
}

// A release comes after the one that it is based on, also where its base came to be
// approved by another way since, with a higher number.
func TestTurnAfterItsBase(t *testing.T) {
	base, next := ordinary().key("ada2"), ordinary().key("ada2").key("ada3")
	s := anchored(t, ordinary())
	before := s.assess("a", "x", ordinary(), ordinary(), nil)
	s.approve(before)
	s.approve(s.assess("x", "b", ordinary(), base, nil))
	release := s.assess("b", "c", base, next, nil)
	s.approve(release)
	s.approve(s.assess("a", "b", ordinary(), base, nil))
	s.must(s.signOff(before, "fin", "checker", "reject"))
	s.state(release, Approved)
	if s.line.Newest(".").Hash != next.hash() {
		t.Error("the newest policy is not that of the release that is based on the other")
	}
}

// A release that goes back to an approved content does not bring a key back that was
// taken out, whatever the policy of that content has.
func TestGoingBackBringsNoKeyBack(t *testing.T) {
	s := anchored(t, ordinary())
	later := ordinary().key("ada2")
	s.approve(s.assess("a", "b", ordinary(), ordinary().without("eva"), nil))
	s.approve(s.assess("a", "c", ordinary(), later, nil))
	s.approve(s.assess("b", "a", ordinary().without("eva"), ordinary(), nil))
	if s.line.Newest(".").Hash != later.hash() {
		t.Error("going back turns the policy")
	}
	s.refused(s.signOff(s.assess("c", "d", later, later, nil), "eva", "checker", "approve"), "was taken out of the policy by assessment 1")
}
