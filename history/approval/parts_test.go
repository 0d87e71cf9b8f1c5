package approval

import (
	"slices"
	"testing"
)

// A rejection is a part as well: who rejected as one cannot approve as another who
// has to be independent of that one (signoff.md, The policy).
func TestIndependenceAfterRejection(t *testing.T) {
	for _, roles := range [][2]string{{"checker", "approver"}, {"approver", "checker"}} {
		s := anchored(t, ordinary())
		n := s.assess("a", "b", ordinary(), ordinary(), nil)
		s.must(s.signOff(n, "ada", roles[0], "reject"))
		for _, decision := range []string{"approve", "reject"} {
			s.refused(s.signOff(n, "ada", roles[1], decision), "ada@tarn.example signed as "+roles[0]+" (entry 4), and the role "+roles[1]+" is independent of that")
		}
		s.state(n, Rejected)
		s.must(s.signOff(n, "ada", roles[0], "approve"))
		s.state(n, Partly)
	}
}

// Signatures alone lead nowhere: what was signed on the ground of a content that is
// approved no more is no ground for others, and its policy is not in force, until
// the approval of the first is given again.
func TestGroundIsTakenAwayAndGivenAgain(t *testing.T) {
	turned := ordinary().role("reader 1 -")
	s := anchored(t, ordinary())
	one := s.assess("a", "b", ordinary(), ordinary(), nil)
	two := s.assess("b", "c", ordinary(), turned, nil)
	three := s.assess("c", "d", turned, turned, nil)
	s.approve(one)
	s.approve(two)
	for _, c := range []struct {
		decision string
		approved bool
		policy   rules
	}{{"reject", false, ordinary()}, {"approve", true, turned}} {
		s.must(s.signOff(one, "bea", "approver", c.decision))
		for _, tree := range []string{"b", "c"} {
			if got := s.line.ApprovedContent(".", treeOf(tree)); got != c.approved {
				t.Errorf("after bea's %s of %d: %s approved is %v", c.decision, one, tree, got)
			}
		}
		if s.line.Newest(".").Hash != c.policy.hash() {
			t.Errorf("after bea's %s of %d the newest policy is another", c.decision, one)
		}
		err := s.signOff(three, "ada", "checker", "approve")
		if c.approved {
			s.must(err)
		} else {
			s.refused(err, "base-not-approved")
		}
	}
}

// Who records what is in service decides on no assessment: neither an approval nor a
// rejection is taken in that role.
func TestInServiceDecidesNothing(t *testing.T) {
	s := anchored(t, ordinary())
	n := s.assess("a", "b", ordinary(), ordinary(), nil)
	for _, decision := range []string{"approve", "reject"} {
		s.refused(s.signOff(n, "cem", InServiceRole, decision), "the role in-service records what is in force and approves nothing")
	}
	s.state(n, Open)
}

// Of two parts of one person that a newer policy keeps apart, the first one counts.
func TestFirstPartCounts(t *testing.T) {
	joint, apart := ordinary().role("approver 2 preparer"), ordinary().role("approver 2 preparer,checker")
	s := newStory(t)
	s.must(s.anchor("a", joint, nil, "checker:ada", "approver:bea", "approver:eva", "in-service:cem"))
	n := s.assess("a", "b", joint, joint, nil)
	s.must(s.signOff(n, "ada", "checker", "approve"))
	s.must(s.signOff(n, "ada", "approver", "approve"))
	turn := s.assess("a", "c", joint, apart, nil)
	s.must(s.signOff(turn, "eva", "approver", "approve"))
	s.approve(turn)
	s.must(s.signOff(n, "bea", "approver", "approve"))
	if got := s.state(n, Partly); !slices.Equal(got.Missing, []string{"approver (1 of 2)"}) {
		t.Errorf("missing are %v", got.Missing)
	}
	s.must(s.signOff(n, "eva", "approver", "approve"))
	s.state(n, Approved)
}
