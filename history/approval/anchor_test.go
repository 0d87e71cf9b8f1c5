package approval

import (
	"testing"
	"time"

	"speedtrail/history/signoff"
)

// Anchor: signed by people who satisfy every role; one for each ledger and folder.
func TestAnchor(t *testing.T) {
	whole := []string{"checker:ada", "approver:bea", "in-service:cem"}
	for _, c := range []struct {
		name   string
		rules  rules
		parts  []string
		edit   func(i int, st *signoff.Statement)
		refuse string // empty: it is taken
	}{
		{name: "every role", rules: ordinary(), parts: whole},
		{name: "roles in another order", rules: ordinary(), parts: []string{"in-service:cem", "approver:bea", "checker:ada"}},
		{name: "more people than needed", rules: ordinary(), parts: append([]string{"checker:fin"}, whole...)},
		{name: "a role is missing", rules: ordinary(), parts: whole[:2], refuse: "the role in-service is signed by 0 of 1 people"},
		{name: "a person too few", rules: ordinary().role("approver 2 preparer,checker"), parts: whole, refuse: "the role approver is signed by 1 of 2 people"},
		{name: "two people", rules: ordinary().role("approver 2 preparer,checker"), parts: append([]string{"approver:fin"}, whole...)},
		{name: "people are counted, not keys", rules: ordinary().role("approver 2 preparer,checker").key("bea2"), parts: append([]string{"approver:bea2"}, whole...), edit: func(i int, st *signoff.Statement) { st.Reason = string(rune('a' + i)) }, refuse: "the role approver is signed by 1 of 2 people"},
		{name: "one person in two independent roles", rules: ordinary(), parts: []string{"checker:ada", "approver:ada", "in-service:cem"}, refuse: "ada@tarn.example signs as checker and as approver, which must be different people"},
		{name: "one person in two roles, the other way round", rules: ordinary(), parts: []string{"approver:ada", "checker:ada", "in-service:cem"}, refuse: "ada@tarn.example signs as approver and as checker, which must be different people"},
		{name: "one person in two roles that are not independent", rules: ordinary(), parts: []string{"checker:cem", "approver:bea", "in-service:cem"}},
		{name: "a preparer may sign: nobody asks about the first revision", rules: ordinary(), parts: []string{"checker:dan", "approver:bea", "in-service:cem"}},
		{name: "nobody", rules: ordinary(), refuse: "nobody signs the anchor"},
		{name: "a policy that is not valid", rules: ordinary().role("checker 1 -").role("approver 1 checker"), parts: whole, refuse: "the policy of the anchor is not valid"},
		{name: "a stranger", rules: ordinary(), parts: []string{"checker:mal", "approver:bea", "in-service:cem"}, refuse: "mal@tarn.example is no person of the policy"},
		{name: "no signer of the role", rules: ordinary(), parts: []string{"checker:ada", "approver:bea", "in-service:fin"}, refuse: "fin@tarn.example is no signer of the role in-service"},
		{name: "an unknown role", rules: ordinary(), parts: append([]string{"owner:ada"}, whole...), refuse: `the policy has no role "owner"`},
		{name: "a strange key", rules: ordinary(), parts: whole, edit: func(i int, st *signoff.Statement) {
			if i == 0 {
				st.Signer = "fin@tarn.example"
			}
		}, refuse: "belongs to ada@tarn.example, not to the signer fin@tarn.example"},
		{name: "another ledger", rules: ordinary(), parts: whole, edit: func(_ int, st *signoff.Statement) { st.Ledger = ledgerID[1:] + "0" }, refuse: "the statement is for the ledger 0112"},
		{name: "another policy", rules: ordinary(), parts: whole, edit: func(_ int, st *signoff.Statement) { st.Policy = hexOf("x") }, refuse: "the statement names the policy " + hexOf("x")},
		{name: "different revisions", rules: ordinary(), parts: whole, edit: func(i int, st *signoff.Statement) {
			if i == 2 {
				st.Revision = commitOf("b")
			}
		}, refuse: "different revisions, folders or contents"},
		{name: "different contents", rules: ordinary(), parts: whole, edit: func(i int, st *signoff.Statement) {
			if i == 2 {
				st.Content = treeOf("b")
			}
		}, refuse: "different revisions, folders or contents"},
		{name: "different folders", rules: ordinary(), parts: whole, edit: func(i int, st *signoff.Statement) {
			if i == 1 {
				st.Folder = "data"
			}
		}, refuse: "different revisions, folders or contents"},
		{name: "from the time to come", rules: ordinary(), parts: whole, edit: func(_ int, st *signoff.Statement) { st.Time = begin.Add(time.Hour + Tolerance + time.Second) }, refuse: "after the time of recording"},
	} {
		t.Run(c.name, func(t *testing.T) {
			s := newStory(t)
			err := s.anchor("a", c.rules, c.edit, c.parts...)
			if c.refuse == "" {
				s.must(err)
				if a := s.line.Anchor("."); a == nil || a.Revision != commitOf("a") || a.Content != treeOf("a") || a.Entry != s.head || !s.line.ApprovedContent(".", treeOf("a")) {
					t.Errorf("%+v", a)
				}
				return
			}
			s.refused(err, c.refuse)
			if s.line.Anchor(".") != nil || s.line.ApprovedContent(".", treeOf("a")) {
				t.Error("it counts all the same")
			}
		})
	}
}

func TestAnchorOnce(t *testing.T) {
	s := anchored(t, ordinary())
	s.refused(s.anchor("b", ordinary(), nil, "checker:ada", "approver:bea", "in-service:cem"), "the folder . has an anchor already, entry 2")
	if a := s.line.Anchor("."); a.Revision != commitOf("a") {
		t.Error("the second anchor counts")
	}
	s.must(s.anchor("b", ordinary(), func(_ int, st *signoff.Statement) { st.Folder = "data" }, "checker:ada", "approver:bea", "in-service:cem"))
	if len(s.line.Anchors()) != 2 || s.line.Anchor("data").Content != treeOf("b") {
		t.Error("another folder has no anchor of its own")
	}
	if s.line.ApprovedContent(".", treeOf("b")) || s.line.ApprovedContent("data", treeOf("a")) {
		t.Error("the anchor of one folder approves a content of the other")
	}
}

// A statement that is to be signed elsewhere is one that somebody can sign: in a role of
// the policy, with a key that is in use, for a folder without an anchor.
func TestForeseeAnchorStatement(t *testing.T) {
	r := ordinary()
	r.people = append(r.people, "gus") // without a key
	s := anchored(t, r)
	s.must(s.revoke("fin", "fin", signoff.Owner))
	sign, keys := r.files()
	for _, c := range []struct{ folder, role, signer, refuse string }{
		{"data", "checker", "ada", ""},
		{".", "checker", "ada", "the folder . has an anchor already, entry 2"},
		{"data", "cheker", "ada", `the policy has no role "cheker"`},
		{"data", "in-service", "fin", "is no signer of the role in-service"},
		{"data", "checker", "mal", "mal@tarn.example is no person of the policy"},
		{"data", "checker", "gus", "gus@tarn.example has no key in this policy"},
		{"data", "checker", "fin", "was revoked by entry 3"},
	} {
		err := s.line.ForeseeAnchor(AnchorBody{AllowedSigners: keys, Format: AnchorFormat, SignOff: sign}, []Unsigned{{Statement: signoff.Statement{
			Kind: signoff.Anchor, Ledger: ledgerID, Revision: commitOf("a"), Folder: c.folder, Content: treeOf("a"), Policy: r.hash(),
			Role: c.role, Signer: principal(c.signer), Reason: "root", Time: s.now, Head: s.head,
		}}}, false, s.now)
		if c.refuse == "" {
			s.must(err)
		} else {
			s.refused(err, c.refuse)
		}
	}
}

// The form of an anchor and of what stands in it.
func TestAnchorForm(t *testing.T) {
	whole := func(s *story) AnchorBody {
		sign, keys := ordinary().files()
		body := AnchorBody{AllowedSigners: keys, Format: AnchorFormat, SignOff: sign}
		for i, role := range []string{"checker", "approver", "in-service"} {
			body.Statements = append(body.Statements, s.sign(&signoff.Statement{Kind: signoff.Anchor, Revision: commitOf("a"), Content: treeOf("a"), Policy: ordinary().hash(), Role: role}, []string{"ada", "bea", "cem"}[i], AnchorFormat))
		}
		return body
	}
	for name, c := range map[string]struct {
		edit   func(s *story, b *AnchorBody)
		refuse string
	}{
		"format of the body":      {func(_ *story, b *AnchorBody) { b.Format = SignOffFormat }, `the format is "speedtrail-sign-off 1"`},
		"format of a statement":   {func(_ *story, b *AnchorBody) { b.Statements[1].Format = SignOffFormat }, `the format is "speedtrail-sign-off 1"`},
		"a statement twice":       {func(_ *story, b *AnchorBody) { b.Statements = append(b.Statements, b.Statements[0]) }, "a statement stands twice"},
		"a signature of another":  {func(_ *story, b *AnchorBody) { b.Statements[0].Signature = b.Statements[1].Signature }, "belongs to bea@tarn.example"},
		"the policy files differ": {func(_ *story, b *AnchorBody) { b.SignOff += "\n" }, "the statement names the policy"},
		"no policy":               {func(_ *story, b *AnchorBody) { b.SignOff, b.AllowedSigners = "", "" }, "the anchor has no policy"},
		"a statement of another kind": {func(s *story, b *AnchorBody) {
			b.Statements[0] = s.sign(&signoff.Statement{Kind: signoff.Revocation, Policy: ordinary().hash(), Role: "checker", Key: "SHA256:x"}, "ada", AnchorFormat)
		}, "a statement of kind revocation cannot serve as anchor"},
		"a malformed statement": {func(_ *story, b *AnchorBody) { b.Statements[0].Statement += "\n" }, "more lines follow"},
	} {
		t.Run(name, func(t *testing.T) {
			s := newStory(t)
			body := whole(s)
			c.edit(s, &body)
			s.refused(s.recordAnchor(body), c.refuse)
		})
	}
}
