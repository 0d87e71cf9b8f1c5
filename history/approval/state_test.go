package approval

import (
	"slices"
	"testing"

	"speedtrail/history/signoff"
)

func TestStates(t *testing.T) {
	s := anchored(t, ordinary())
	n := s.assess("a", "b", ordinary(), ordinary(), nil)
	if got := s.state(n, Open); !slices.Equal(got.Missing, []string{"checker (0 of 1)", "approver (0 of 1)"}) || len(got.Blocks) > 0 || len(got.Signed) > 0 {
		t.Errorf("%+v", got)
	}
	s.must(s.signOff(n, "ada", "checker", "approve"))
	if got := s.state(n, Partly); !slices.Equal(got.Missing, []string{"approver (0 of 1)"}) || len(got.Signed) != 1 {
		t.Errorf("%+v", got)
	}
	if s.line.ApprovedContent(".", treeOf("b")) {
		t.Error("a partly signed target is approved")
	}
	s.must(s.signOff(n, "bea", "approver", "approve"))
	if got := s.state(n, Approved); len(got.Missing) > 0 || !s.line.ApprovedContent(".", treeOf("b")) {
		t.Errorf("%+v", got)
	}
	s.must(s.signOff(n, "fin", "checker", "reject"))
	if got := s.state(n, Rejected); len(got.RejectedBy) != 1 || got.RejectedBy[0].Signer != "fin@tarn.example" || s.line.ApprovedContent(".", treeOf("b")) {
		t.Errorf("%+v", got)
	}
	if got := s.line.State(99); got.Word != Unreadable {
		t.Errorf("an assessment that is not there, or cannot be read, is %+v", got)
	}
}

// People are counted, not signatures.
func TestPeopleAreCounted(t *testing.T) {
	r := ordinary().role("approver 2 preparer,checker").key("bea2")
	s := anchored(t, ordinary())
	s.line.anchors["."].Policy = s.line.Policy(r.files()) // the anchor of two approvers, without signing it
	n := s.assess("a", "b", r, r, nil)
	s.must(s.signOff(n, "ada", "checker", "approve"))
	s.must(s.signOff(n, "bea", "approver", "approve"))
	s.must(s.signOff(n, "bea2", "approver", "approve"))
	s.must(s.signOff(n, "bea", "approver", "approve"))
	if got := s.state(n, Partly); !slices.Equal(got.Missing, []string{"approver (1 of 2)"}) {
		t.Errorf("%+v", got)
	}
	s.must(s.signOff(n, "eva", "approver", "approve"))
	s.state(n, Approved)
}

// A person's last decision counts.
func TestLastDecision(t *testing.T) {
	s := anchored(t, ordinary())
	n := s.assess("a", "b", ordinary(), ordinary(), nil)
	s.approve(n)
	s.must(s.signOff(n, "bea", "approver", "reject"))
	s.state(n, Rejected)
	s.must(s.signOff(n, "eva", "approver", "approve"))
	s.state(n, Rejected) // somebody else's approval clears nothing
	s.must(s.signOff(n, "bea", "approver", "approve"))
	s.state(n, Approved)
}

// A rejection follows the content: a new assessment of it, from another base or
// over a new empty commit, does not shed it.
func TestRejectionFollowsContent(t *testing.T) {
	for name, again := range map[string]func(a *Assessment){
		"a new assessment of the same commits": nil,
		"a new commit without a change":        func(a *Assessment) { a.Target = commitOf("empty") },
		"another base":                         func(a *Assessment) { a.Base, a.Since = commitOf("a2"), commitOf("a") },
		"other findings":                       func(a *Assessment) { a.Findings = "outside 1" },
	} {
		t.Run(name, func(t *testing.T) {
			s := anchored(t, ordinary())
			first := s.assess("a", "b", ordinary(), ordinary(), nil)
			s.must(s.signOff(first, "bea", "approver", "reject"))
			second := s.assess("a", "b", ordinary(), ordinary(), again)
			if got := s.state(second, Rejected); len(got.RejectedBy) != 1 || got.RejectedBy[0].Assessment != first || len(got.Signed) != 0 {
				t.Errorf("%+v", got)
			}
			s.must(s.signOff(second, "ada", "checker", "approve"))
			s.must(s.signOff(second, "fin", "approver", "approve"))
			s.state(second, Rejected)
			// The same person clears it by approving the same content, in whatever
			// assessment of it.
			s.must(s.signOff(second, "bea", "approver", "approve"))
			s.state(second, Approved)
			s.state(first, Open)
		})
	}
}

// It is the person that clears it, in whatever role.
func TestRejectionClearedInAnotherRole(t *testing.T) {
	s := anchored(t, ordinary())
	first := s.assess("a", "b", ordinary(), ordinary(), nil)
	s.must(s.signOff(first, "bea", "approver", "reject"))
	second := s.assess("a", "b", ordinary(), ordinary(), nil)
	s.must(s.signOff(second, "fin", "approver", "approve"))
	s.state(second, Rejected)
	s.must(s.signOff(second, "bea", "checker", "approve"))
	s.state(second, Approved)
}

// An approval that was signed before a rejection does not lift it when it is handed
// in afterwards, whatever the numbers.
func TestRejectionIsNotLiftedByTheOlder(t *testing.T) {
	s := anchored(t, ordinary())
	first := s.assess("a", "b", ordinary(), ordinary(), nil)
	before, at := s.head, s.line.times[s.head.Seq-1]
	second := s.assess("a", "b", ordinary(), ordinary(), nil)
	s.must(s.signOff(second, "bea", "approver", "reject"))
	s.refused(s.signOff(first, "bea", "approver", "approve", func(st *signoff.Statement) { st.Head, st.Time = before, at }), "is older than the last decision of bea@tarn.example on it")
	s.state(first, Rejected)
	s.state(second, Rejected)
}

// Who approved a content in one role does not take another one, which is to be
// independent, by another number.
func TestIndependenceIsByContent(t *testing.T) {
	s := anchored(t, ordinary())
	first := s.assess("a", "b", ordinary(), ordinary(), nil)
	second := s.assess("a", "b", ordinary(), ordinary(), nil)
	s.must(s.signOff(first, "ada", "checker", "approve"))
	s.refused(s.signOff(second, "ada", "approver", "approve"), "ada@tarn.example signed as checker")
}

// Another content is not rejected with it.
func TestRejectionStaysWithContent(t *testing.T) {
	s := anchored(t, ordinary())
	first := s.assess("a", "b", ordinary(), ordinary(), nil)
	s.must(s.signOff(first, "bea", "approver", "reject"))
	second := s.assess("a", "c", ordinary(), ordinary(), nil)
	s.approve(second)
	s.state(first, Rejected)
}

// What was approved on the ground of a content that is rejected later is approved
// no more, and comes back when the rejection is cleared.
func TestRejectionBreaksTheLine(t *testing.T) {
	s := anchored(t, ordinary())
	one := s.assess("a", "b", ordinary(), ordinary(), nil)
	s.approve(one)
	two := s.assess("b", "c", ordinary(), ordinary(), nil)
	s.approve(two)
	s.must(s.signOff(one, "bea", "approver", "reject"))
	if got := s.state(two, Partly); !slices.Equal(got.Blocks, []string{"base-not-approved"}) {
		t.Errorf("%+v", got)
	}
	s.refused(s.signOff(two, "fin", "approver", "approve"), "base-not-approved")
	s.must(s.signOff(one, "bea", "approver", "approve"))
	s.state(two, Approved)
}

// Superseded is a remark: another assessment from the same base is approved.
func TestSuperseded(t *testing.T) {
	s := anchored(t, ordinary())
	one := s.assess("a", "b", ordinary(), ordinary(), nil)
	two := s.assess("a", "c", ordinary(), ordinary(), nil)
	s.must(s.signOff(one, "ada", "checker", "approve"))
	if s.line.State(one).Superseded != 0 || s.line.State(two).Superseded != 0 {
		t.Error("superseded by something that is not approved")
	}
	s.approve(two)
	if got := s.state(one, Partly); got.Superseded != two || len(got.Signed) != 1 {
		t.Errorf("%+v", got)
	}
	s.must(s.signOff(one, "bea", "approver", "approve"))
	if got := s.state(one, Approved); got.Superseded != two {
		t.Errorf("%+v", got)
	}
	if got := s.state(two, Approved); got.Superseded != one {
		t.Errorf("%+v", got)
	}
	// The same content again, and an assessment from another base, supersede
	// nothing.
	same := s.assess("a", "c", ordinary(), ordinary(), nil)
	if got := s.line.State(same).Superseded; got != one {
		t.Errorf("superseded by %d", got)
	}
	next := s.assess("b", "d", ordinary(), ordinary(), nil)
	s.approve(next)
	if got := s.line.State(two).Superseded; got != one {
		t.Errorf("superseded by %d", got)
	}
}

// What keeps an assessment from being approved is named, and nobody may sign what
// is not based on something approved.
func TestBlocks(t *testing.T) {
	for name, c := range map[string]struct {
		base, target string
		edit         func(*Assessment)
		block        string
		refuse       string // empty: it may be signed
	}{
		"base not approved":         {"x", "b", nil, "base-not-approved", "base-not-approved"},
		"no ancestor":               {"a", "b", func(a *Assessment) { a.BaseNotAncestor = true }, "base-not-ancestor", "no ancestor"},
		"unknown preparer":          {"a", "b", func(a *Assessment) { a.Preparers = []string{"dan@tarn.example", "who@fell.example"} }, "unknown-preparer: who@fell.example", ""},
		"several unknown preparers": {"a", "b", func(a *Assessment) { a.Preparers = []string{"b@fell.example", "a@fell.example"} }, "unknown-preparer: b@fell.example, a@fell.example", ""},
		"a preparer of no address":  {"a", "b", func(a *Assessment) { a.Preparers = []string{"", "dan@tarn.example"} }, "unknown-preparer: somebody without an address", ""},
		"another folder":            {"a", "b", func(a *Assessment) { a.Folder = "data" }, "no policy is anchored", "no policy is anchored"},
		"the content of the base":   {"a", "b", func(a *Assessment) { a.TargetTree = a.BaseTree }, "", "there is nothing to sign"},
		"nobody prepared it":        {"a", "b", func(a *Assessment) { a.Preparers = nil }, "", "nobody is known to have prepared it"},
		"base is the target":        {"a", "b", func(a *Assessment) { a.Target = a.Base }, "", "its base is its target"},
		"no policy of the target":   {"a", "b", func(a *Assessment) { a.Next = Policy{} }, "", "the target has no policy"},
		"target's policy is faulty": {"a", "b", func(a *Assessment) { a.Next = New(ledgerID).Policy("x", "y") }, "", "the policy of the target is not valid"},
		"base's policy is faulty": {"a", "b", func(a *Assessment) { a.Policy = New(ledgerID).Policy("x", "y") },
			"its base has another policy than the approved revision of the same content", "the policy of the base is not valid"},
		"another policy of the anchor": {"a", "b", func(a *Assessment) { a.Policy = New(ledgerID).Policy(ordinary().role("reader 1 -").files()) },
			"its base has another policy than the approved revision of the same content", "its base has another policy"},
		"another policy of the anchor, as a target": {"a", "b", func(a *Assessment) {
			a.TargetTree, a.Next = treeOf("a"), New(ledgerID).Policy(ordinary().role("reader 1 -").files())
		}, "its target has another policy than the approved revision of the same content", "its target has another policy"},
		// The history of another commit of the same content can hold people who
		// prepared what the target takes up.
		"another commit of the anchor's content": {"a", "b", func(a *Assessment) { a.Base = commitOf("a2") },
			"assess again: its preparers are counted from " + commitOf("a2") + ", which is not the approved commit", "who prepared that is not known"},
		"counted from a commit that is not approved": {"a", "b", func(a *Assessment) { a.Since = commitOf("a2") },
			"assess again: its preparers are counted from " + commitOf("a2") + ", which is not the approved commit", "who prepared that is not known"},
	} {
		t.Run(name, func(t *testing.T) {
			s := anchored(t, ordinary())
			n := s.assess(c.base, c.target, ordinary(), ordinary(), c.edit)
			var blocks []string
			if c.block != "" {
				blocks = []string{c.block}
			}
			if got := s.state(n, Open); !slices.Equal(got.Blocks, blocks) {
				t.Errorf("blocked by %q, want %q", got.Blocks, blocks)
			}
			err1, err2 := s.signOff(n, "ada", "checker", "approve"), s.signOff(n, "bea", "approver", "approve")
			if c.refuse == "" {
				s.must(err1)
				s.must(err2)
				s.state(n, Partly)
				return
			}
			s.refused(err1, c.refuse)
			s.refused(err2, c.refuse)
			s.state(n, Open)
		})
	}
}

// Before there is an anchor nothing can be signed, and what was assessed before it
// can be signed afterwards.
func TestBeforeTheAnchor(t *testing.T) {
	s := newStory(t)
	n := s.assess("a", "b", ordinary(), ordinary(), nil)
	s.refused(s.signOff(n, "ada", "checker", "approve"), "no policy is anchored")
	s.must(s.anchor("a", ordinary(), nil, "checker:ada", "approver:bea", "in-service:cem"))
	s.approve(n)
}

// An approved target is a base, in whatever order the assessments were recorded.
func TestLineInAnyOrder(t *testing.T) {
	s := anchored(t, ordinary())
	two := s.assess("b", "c", ordinary(), ordinary(), nil)
	one := s.assess("a", "b", ordinary(), ordinary(), nil)
	s.refused(s.signOff(two, "ada", "checker", "approve"), "base-not-approved")
	s.approve(one)
	s.approve(two)
	if !s.line.Led(".", treeOf("a"), treeOf("c")) {
		t.Error("approved assessments do not lead from a to c")
	}
}

// The approved commits of a content are the anchor's and the targets of approved
// assessments; from each of them preparers can be counted.
func TestApprovedCommits(t *testing.T) {
	s := anchored(t, ordinary())
	commits := func(name string) []string { return s.line.ApprovedCommits(".", treeOf(name)) }
	if got := commits("a"); !slices.Equal(got, []string{commitOf("a")}) {
		t.Errorf("the anchor's: %v", got)
	}
	n := s.assess("a", "b", ordinary(), ordinary(), nil)
	s.must(s.signOff(n, "ada", "checker", "approve"))
	if got := commits("b"); got != nil {
		t.Errorf("of a partly signed target: %v", got)
	}
	s.must(s.signOff(n, "bea", "approver", "approve"))
	s.approve(s.assess("a", "b", ordinary(), ordinary(), func(a *Assessment) { a.Target = commitOf("squashed") }))
	if got := commits("b"); !slices.Equal(got, []string{commitOf("b"), commitOf("squashed")}) {
		t.Errorf("of two approved commits of one content: %v", got)
	}
	if got := s.line.ApprovedCommits("data", treeOf("a")); got != nil {
		t.Errorf("of another folder: %v", got)
	}
	for _, base := range []string{"b", "squashed"} {
		s.approve(s.assess("b", "c", ordinary(), ordinary(), func(a *Assessment) { a.Base, a.Target = commitOf(base), commitOf("from "+base) }))
	}
	s.approve(s.assess("b", "d", ordinary(), ordinary(), func(a *Assessment) { a.Base, a.Since = commitOf("merged"), commitOf("squashed") }))
	s.must(s.signOff(n, "fin", "checker", "reject"))
	if got := commits("b"); got != nil {
		t.Errorf("of a content that is rejected: %v", got)
	}
}
