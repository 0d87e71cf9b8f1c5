package approval

import (
	"crypto/ecdsa"
	"crypto/elliptic"
	"crypto/rand"
	"encoding/base64"
	"math/big"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/hiddeco/sshsig"
	"golang.org/x/crypto/ssh"

	"speedtrail/history/chain"
	"speedtrail/history/signoff"
)

// Preparers are people by any of their addresses, compared without letter case; a
// Co-authored-by address is one of the addresses of an assessment.
func TestIndependenceOfPreparers(t *testing.T) {
	for name, c := range map[string]struct {
		preparers []string
		refuse    string
	}{
		"somebody else":             {[]string{"dan@tarn.example"}, ""},
		"the signer":                {[]string{"ada@tarn.example"}, "ada@tarn.example prepared the change (ada@tarn.example), and the role checker is independent of preparer"},
		"in other letters":          {[]string{"ADA@Tarn.Example"}, "ada@tarn.example prepared the change (ADA@Tarn.Example)"},
		"by another address":        {[]string{"ada@users.example"}, "ada@tarn.example prepared the change (ada@users.example)"},
		"as one of several":         {[]string{"dan@tarn.example", "eva@tarn.example", "ada@users.example"}, "ada@tarn.example prepared the change (ada@users.example)"},
		"other than ASCII letters":  {[]string{"\u0391da@tarn.example"}, ""}, // a Greek capital alpha
		"an address that begins so": {[]string{"ada@tarn.example.example"}, ""},
	} {
		t.Run(name, func(t *testing.T) {
			s := anchored(t, ordinary())
			n := s.assess("a", "b", ordinary(), ordinary(), func(a *Assessment) { a.Preparers = c.preparers })
			err := s.signOff(n, "ada", "checker", "approve")
			if c.refuse == "" {
				s.must(err)
				return
			}
			s.refused(err, c.refuse)
			s.refused(s.signOff(n, "ada", "checker", "reject"), c.refuse)
			s.state(n, Open)
		})
	}
}

// A role that is not independent of preparer may be taken by one.
func TestRoleOfPreparers(t *testing.T) {
	r := ordinary().role("author 1 -")
	s := anchored(t, ordinary())
	s.line.anchors["."].Policy = s.line.Policy(r.files())
	n := s.assess("a", "b", r, r, nil)
	s.must(s.signOff(n, "dan", "author", "approve"))
	s.refused(s.signOff(n, "dan", "checker", "approve"), "prepared the change")
	s.approve(n)
}

// One person in two roles that must be independent: the earlier entry counts,
// whichever role names the other.
func TestIndependenceOfRoles(t *testing.T) {
	for _, roles := range [][2]string{{"checker", "approver"}, {"approver", "checker"}} {
		s := anchored(t, ordinary())
		n := s.assess("a", "b", ordinary(), ordinary(), nil)
		s.must(s.signOff(n, "ada", roles[0], "approve"))
		for _, decision := range []string{"approve", "reject"} {
			s.refused(s.signOff(n, "ada", roles[1], decision), "ada@tarn.example signed as "+roles[0]+" (entry 4), and the role "+roles[1]+" is independent of that")
		}
		if got := s.state(n, Partly); len(got.Signed) != 1 || got.Signed[0].Role != roles[0] {
			t.Errorf("%+v", got)
		}
		// It is about one assessment only.
		other := s.assess("a", "c", ordinary(), ordinary(), nil)
		s.must(s.signOff(other, "ada", roles[1], "approve"))
	}
	r := ordinary().role("reader 1 preparer")
	s := anchored(t, ordinary())
	s.line.anchors["."].Policy = s.line.Policy(r.files())
	n := s.assess("a", "b", r, r, nil)
	s.must(s.signOff(n, "ada", "checker", "approve"))
	s.must(s.signOff(n, "ada", "reader", "approve"))
	s.must(s.signOff(n, "bea", "approver", "approve"))
	s.state(n, Approved)
}

// The policy of the base decides, not the one that the change brings.
func TestPolicyOfTheBase(t *testing.T) {
	open := rules{[]string{"mal", "dan"}, []string{"checker 1 preparer", "approver 1 preparer"}, []string{"mal", "dan"}}
	s := anchored(t, ordinary())
	n := s.assess("a", "b", ordinary(), open, nil)
	s.refused(s.signOff(n, "mal", "checker", "approve"), "mal@tarn.example is no person of the policy")
	s.refused(s.signOff(n, "mal", "checker", "approve", func(st *signoff.Statement) { st.Policy = open.hash() }), "the policy of the statement is "+open.hash())
	s.refused(s.signOff(n, "mal", "checker", "approve", func(st *signoff.Statement) { st.Signer = "ada@tarn.example" }), "is not allowed to anyone")
	s.approve(n)
	if got := s.line.Newest("."); got.Hash != open.hash() {
		t.Error("the newest policy is not that of the approved target")
	}
	// From now on it decides.
	next := s.assess("b", "c", open, open, nil)
	s.must(s.signOff(next, "mal", "checker", "approve"))
	s.refused(s.signOff(next, "ada", "checker", "approve"), "ada@tarn.example is no person of the policy")
}

// The key must stand in the newest approved policy as well: an assessment of an
// older base cannot be signed with a key that was taken out.
func TestNewestPolicy(t *testing.T) {
	turned := ordinary().without("ada").key("ada2")
	s := anchored(t, ordinary())
	s.must(s.signOff(s.assess("a", "x", ordinary(), ordinary(), nil), "ada", "checker", "approve"))
	n := s.assess("a", "b", ordinary(), turned, nil)
	s.must(s.signOff(n, "ada", "checker", "approve"))
	s.must(s.signOff(n, "bea", "approver", "approve"))
	s.state(n, Approved)
	old := s.names[". a-x"]
	s.refused(s.signOff(old, "ada", "checker", "approve"), "by the newest approved policy: the key "+fingerprintOf("ada")+" is not allowed to anyone by this policy")
	s.refused(s.signOff(old, "ada2", "checker", "approve"), "the key "+fingerprintOf("ada2")+" is not allowed to anyone by this policy")
	s.must(s.signOff(old, "bea", "approver", "approve"))
	if got := s.state(old, Approved); len(got.Signed) != 2 {
		t.Errorf("what was signed before does not count: %+v", got)
	}
}

// A release of before the keys were turned over that is assessed and approved
// again, by other rules for example, does not bring the old keys back.
func TestNewestPolicyIsNotTurnedBack(t *testing.T) {
	turned := ordinary().without("ada").key("ada2")
	s := anchored(t, ordinary())
	s.approve(s.assess("a", "b", ordinary(), ordinary(), nil))
	s.approve(s.assess("b", "c", ordinary(), turned, nil))
	again := s.assess("a", "b", ordinary(), ordinary(), func(a *Assessment) { a.Rules = 3 })
	s.must(s.signOff(again, "fin", "checker", "approve"))
	s.must(s.signOff(again, "bea", "approver", "approve"))
	if s.line.Newest(".").Hash != turned.hash() {
		t.Error("an old release that is approved again puts its policy in force")
	}
}

// What a sibling leaves in its policy, which another release took out, does not
// come back with it; what it brings in does.
func TestKeyTakenOutStaysOut(t *testing.T) {
	note := ordinary().role("in-service 1 - eva") // anything but the keys
	s := anchored(t, ordinary())
	without, sibling := s.assess("a", "b", ordinary(), ordinary().without("fin"), nil), s.assess("a", "c", ordinary(), note, nil)
	other := s.assess("a", "d", ordinary(), ordinary(), nil)
	s.approve(without)
	s.refused(s.signOff(other, "fin", "checker", "approve"), "by the newest approved policy")
	s.approve(sibling)
	if s.line.Newest(".").Hash != note.hash() {
		t.Fatal("the sibling turns nothing")
	}
	s.refused(s.signOff(other, "fin", "checker", "approve"), "was taken out of the policy by assessment 1, which is approved")
	s.must(s.signOff(other, "eva", "checker", "approve"))
	// From the release that took it out, the key can be brought in again.
	again := s.assess("b", "e", ordinary().without("fin"), ordinary(), nil)
	s.approve(again)
	s.must(s.signOff(other, "fin", "approver", "approve"))
}

// Whoever takes an approval back and gives it again moves no turn of the policy
// behind a later one, and a key that is out stays out; so it does where a release
// goes back to what was approved before.
func TestPolicyTurnsKeepTheirOrder(t *testing.T) {
	more := ordinary().key("ada2")
	for name, end := range map[string]string{"forward": "c", "back to the anchor": "a"} {
		t.Run(name, func(t *testing.T) {
			s := anchored(t, ordinary())
			// The later release has the lower number.
			second := s.assess("b", end, more, ordinary(), nil)
			first := s.assess("a", "b", ordinary(), more, nil)
			other := s.assess("a", "d", ordinary(), ordinary(), nil)
			sign := func(n int64) {
				t.Helper()
				s.must(s.signOff(n, "ada", "checker", "approve"))
				s.must(s.signOff(n, "bea", "approver", "approve"))
			}
			sign(first)
			sign(second)
			late := s.assess("b", "e", more, more, nil)
			check := func() {
				t.Helper()
				if end != "a" && s.line.Newest(".").Hash != ordinary().hash() {
					t.Error("the newest policy is that of an older release")
				}
				s.refused(s.signOff(late, "ada2", "checker", "approve"), fingerprintOf("ada2"))
			}
			check()
			s.must(s.signOff(first, "ada", "checker", "reject"))
			s.must(s.signOff(first, "ada", "checker", "approve"))
			for range 20 { // whatever the order of maps
				check()
			}
			s.must(s.signOff(other, "fin", "checker", "approve"))
		})
	}
}

// valid-after and valid-before include their bounds (ssh-keygen(1), ALLOWED
// SIGNERS, with the inclusive reading of the design), at the time of the statement
// and at that of the recording.
func TestValidity(t *testing.T) {
	bound := time.Date(2026, 3, 5, 12, 0, 0, 0, time.UTC)
	for name, c := range map[string]struct {
		options          string
		signed, recorded time.Duration // after the bound
		refuse           string
	}{
		"after, at the bound":          {`valid-after="20260305120000Z"`, 0, 0, ""},
		"after, a second before":       {`valid-after="20260305120000Z"`, -time.Second, 0, "is valid from 2026-03-05T12:00:00Z only"},
		"after, recorded before":       {`valid-after="20260305120000Z"`, 0, -time.Second, "is valid from 2026-03-05T12:00:00Z only"},
		"before, at the bound":         {`valid-before="20260305120000Z"`, 0, 0, ""},
		"before, signed in time":       {`valid-before="20260305120000Z"`, -time.Hour, 0, ""},
		"before, recorded a second on": {`valid-before="20260305120000Z"`, -time.Hour, time.Second, "was valid until 2026-03-05T12:00:00Z"},
		"before, signed a second on":   {`valid-before="20260305120000Z"`, time.Second, 0, "was valid until 2026-03-05T12:00:00Z"},
		"both, at one bound":           {`valid-after="20260305120000Z",valid-before="20260305120001Z"`, 0, 0, ""},
		"both, at the other one":       {`valid-after="20260305115959Z",valid-before="20260305120000Z"`, 0, 0, ""},
		"both, a second late":          {`valid-after="20260305115959Z",valid-before="20260305120000Z"`, 0, time.Second, "was valid until"},
		"a day, from midnight":         {`valid-after="20260305Z"`, -12 * time.Hour, -12 * time.Hour, ""},
		"a day, before midnight":       {`valid-after="20260305Z"`, -12*time.Hour - time.Second, 0, "is valid from 2026-03-05T00:00:00Z only"},
	} {
		t.Run(name, func(t *testing.T) {
			r := ordinary().key("ada " + c.options)
			s := anchored(t, ordinary())
			s.line.anchors["."].Policy = s.line.Policy(r.files())
			n := s.assess("a", "b", r, r, nil)
			s.now = bound.Add(c.recorded)
			err := s.signOff(n, "ada", "checker", "approve", func(st *signoff.Statement) { st.Time = bound.Add(c.signed) })
			if c.refuse == "" {
				s.must(err)
			} else {
				s.refused(err, c.refuse)
			}
		})
	}
}

// The bounds in the policy of the base hold, whatever the newest policy says.
func TestValidityInTheBase(t *testing.T) {
	bounded := ordinary().key(`ada valid-before="20260305120000Z"`)
	s := anchored(t, ordinary())
	s.line.anchors["."].Policy = s.line.Policy(bounded.files())
	s.approve(s.assess("a", "b", bounded, ordinary(), nil))
	n := s.assess("a", "c", bounded, bounded, nil)
	s.now = time.Date(2026, 3, 5, 12, 0, 1, 0, time.UTC)
	s.refused(s.signOff(n, "ada", "checker", "approve", func(st *signoff.Statement) { st.Time = s.now.Add(-time.Second) }), "was valid until 2026-03-05T12:00:00Z")
	next := s.assess("b", "d", ordinary(), ordinary(), nil)
	s.must(s.signOff(next, "ada", "checker", "approve"))
}

func TestNamespaces(t *testing.T) {
	for options, good := range map[string]bool{
		`namespaces="speedtrail-signoff"`: true, `namespaces="file,speedtrail-signoff"`: true, `namespaces="file"`: false, `namespaces="speedtrail-signoff2"`: false,
	} {
		r := ordinary().key("ada " + options)
		s := anchored(t, ordinary())
		s.line.anchors["."].Policy = s.line.Policy(r.files())
		n := s.assess("a", "b", r, r, nil)
		err := s.signOff(n, "ada", "checker", "approve")
		if good {
			s.must(err)
		} else {
			s.refused(err, "is not for the namespace speedtrail-signoff")
		}
	}
}

// Heads and times of a statement.
func TestHeadAndTime(t *testing.T) {
	head := func(seq int64) func(s *story, st *signoff.Statement) {
		return func(s *story, st *signoff.Statement) { st.Head = s.line.heads[seq-1] }
	}
	for name, c := range map[string]struct {
		edit   func(s *story, st *signoff.Statement)
		refuse string
	}{
		"the newest entry":          {head(5), ""},
		"the assessment":            {head(3), "is older than the last decision of ada@tarn.example on it, entry 4"},
		"the last decision":         {head(4), ""},
		"before the assessment":     {head(2), "is older than the assessment, entry 3"},
		"no such entry":             {func(_ *story, st *signoff.Statement) { st.Head = chain.Head{Seq: 6, Hash: hexOf("x")} }, "is no entry of this ledger"},
		"another hash":              {func(_ *story, st *signoff.Statement) { st.Head = chain.Head{Seq: 5, Hash: hexOf("x")} }, "is no entry of this ledger"},
		"at the head's time":        {func(s *story, st *signoff.Statement) { st.Time = s.line.times[4] }, ""},
		"a second before the head":  {func(s *story, st *signoff.Statement) { st.Time = s.line.times[4].Add(-time.Second) }, "before the entry 5 that it names"},
		"five minutes ahead":        {func(s *story, st *signoff.Statement) { st.Time = s.now.Add(Tolerance) }, ""},
		"five minutes and a second": {func(s *story, st *signoff.Statement) { st.Time = s.now.Add(Tolerance + time.Second) }, "after the time of recording"},
		"another ledger":            {func(_ *story, st *signoff.Statement) { st.Ledger = ledgerID[1:] + "f" }, "is for the ledger"},
		"no such assessment":        {func(_ *story, st *signoff.Statement) { st.Assessment = 9 }, "there is no assessment 9"},
		"another digest":            {func(_ *story, st *signoff.Statement) { st.Digest = hexOf("x") }, "the digest of the statement"},
		"another base":              {func(_ *story, st *signoff.Statement) { st.Base = commitOf("x") }, "the base of the statement"},
		"another target":            {func(_ *story, st *signoff.Statement) { st.Target = commitOf("x") }, "the target of the statement"},
		"another folder":            {func(_ *story, st *signoff.Statement) { st.Folder = "data" }, "the folder of the statement"},
		"other rules":               {func(_ *story, st *signoff.Statement) { st.Rules = 1 }, "the rules version of the statement"},
		"other findings":            {func(_ *story, st *signoff.Statement) { st.Findings = "outside 1" }, "the list of findings of the statement"},
		"a third decision":          {func(_ *story, st *signoff.Statement) { st.Decision = "maybe" }, `the decision is "maybe"`},
		"the role in-service":       {func(_ *story, st *signoff.Statement) { st.Role, st.Signer = InServiceRole, "ada@tarn.example" }, "ada@tarn.example is no signer of the role in-service"},
	} {
		t.Run(name, func(t *testing.T) {
			s := anchored(t, ordinary())
			n := s.assess("a", "b", ordinary(), ordinary(), nil)  // 3
			s.must(s.signOff(n, "ada", "checker", "approve"))     // 4
			s.assess("a", "c", ordinary(), ordinary(), nil)       // 5
			edit := func(st *signoff.Statement) { c.edit(s, st) } // 6
			err := s.signOff(n, "ada", "checker", "approve", edit, func(st *signoff.Statement) { st.Reason = "again" })
			if c.refuse == "" {
				s.must(err)
			} else {
				s.refused(err, c.refuse)
			}
		})
	}
}

// A statement counts once, whatever its signature looks like: ECDSA has a second
// signature (r, n-s) for every one, which anybody can compute.
func TestReplay(t *testing.T) {
	s := anchored(t, ordinary())
	n := s.assess("a", "b", ordinary(), ordinary(), nil)
	s.must(s.signOff(n, "bea", "approver", "approve"))
	approval := s.last
	s.refused(s.record(chain.SignOff, approval), "the statement is recorded already, as entry 4")
	s.must(s.signOff(n, "bea", "approver", "reject"))
	s.refused(s.record(chain.SignOff, approval), "the statement is recorded already, as entry 4")
	s.state(n, Rejected)
}

func TestReplayOfECDSA(t *testing.T) {
	key, err := ecdsa.GenerateKey(elliptic.P256(), rand.Reader)
	if err != nil {
		t.Fatal(err)
	}
	signer, err := ssh.NewSignerFromKey(key)
	if err != nil {
		t.Fatal(err)
	}
	sign, keys := ordinary().without("ada").files()
	keys += "ada@tarn.example " + string(ssh.MarshalAuthorizedKey(signer.PublicKey()))
	s := anchored(t, ordinary())
	policy := s.line.Policy(sign, keys)
	if policy.Problem != nil {
		t.Fatal(policy.Problem)
	}
	s.line.anchors["."].Policy = policy
	n := s.assess("a", "b", ordinary(), ordinary(), func(a *Assessment) { a.Policy, a.Next = policy, policy })
	text := []byte(s.sign(s.statementOf(n, "checker", "approve"), "ada", SignOffFormat).Statement)
	signature, err := sshsig.Sign(strings.NewReader(string(text)), signer, sshsig.HashSHA512, signoff.Namespace)
	if err != nil {
		t.Fatal(err)
	}
	first := Signed{Format: SignOffFormat, Statement: string(text), Signature: armoured(signature)}
	var rs struct{ R, S *big.Int }
	if err := ssh.Unmarshal(signature.Signature.Blob, &rs); err != nil {
		t.Fatal(err)
	}
	rs.S.Sub(elliptic.P256().Params().N, rs.S)
	signature.Signature.Blob = ssh.Marshal(rs)
	second := Signed{Format: SignOffFormat, Statement: string(text), Signature: armoured(signature)}
	if err := signoff.Verify(text, []byte(second.Signature), signer.PublicKey()); err != nil || first.Signature == second.Signature {
		t.Fatalf("the altered signature is no second one: %v", err)
	}
	s.must(s.record(chain.SignOff, first))
	s.refused(s.record(chain.SignOff, second), "the statement is recorded already, as entry 4")
}

// armoured writes a signature as ssh-keygen does.
func armoured(s *sshsig.Signature) string {
	text := base64.StdEncoding.EncodeToString(s.Marshal())
	out := "-----BEGIN SSH SIGNATURE-----\n"
	for len(text) > 0 {
		n := min(70, len(text))
		out, text = out+text[:n]+"\n", text[n:]
	}
	return out + "-----END SSH SIGNATURE-----\n"
}

// No statement serves as one of another kind, and no body as one of another
// format.
func TestKinds(t *testing.T) {
	kinds := map[chain.Kind]string{chain.SignOff: SignOffFormat, chain.InForce: InForceFormat, chain.Revocation: RevocationFormat}
	statement := func(s *story, kind chain.Kind) *signoff.Statement {
		switch kind {
		case chain.SignOff:
			return s.statementOf(1, "checker", "approve")
		case chain.InForce:
			return &signoff.Statement{Kind: signoff.InForce, Revision: commitOf("a"), Content: treeOf("a"), Policy: ordinary().hash(), Since: begin, Corrects: CorrectsNothing, Role: InServiceRole}
		}
		return &signoff.Statement{Kind: signoff.Revocation, Policy: ordinary().hash(), Key: fingerprintOf("ada"), Role: "checker"}
	}
	for of := range kinds {
		for as, format := range kinds {
			if of == as {
				continue
			}
			s := anchored(t, ordinary())
			s.assess("a", "b", ordinary(), ordinary(), nil)
			s.refused(s.record(as, s.sign(statement(s, of), "cem", format)), "a statement of kind "+string(of)+" cannot serve as "+string(as))
			s.refused(s.record(as, s.sign(statement(s, of), "cem", kinds[of])), "the format is")
		}
	}
	s := anchored(t, ordinary())
	for _, kind := range []chain.Kind{chain.Ledger, chain.Assessment, "note"} {
		if _, err := s.line.Check(kind, Signed{}, s.now); err == nil {
			t.Errorf("a signed statement passes as an entry of kind %q", kind)
		}
	}
}

// A base of before a turn of the policy does not bring the former policy back: the
// numbers, signers and independence of the newest approved one count as well, and
// so do roles that only it has.
func TestOldBaseDoesNotBringOldPolicyBack(t *testing.T) {
	lone := rules{ordinary().people, []string{"checker 1 preparer", "in-service 1 - cem"}, ordinary().keys}
	anchoredLone := func(t *testing.T) *story {
		s := newStory(t)
		s.rules = lone
		s.must(s.anchor("a", lone, nil, "checker:ada", "in-service:cem"))
		return s
	}
	begin := func(t *testing.T, old, now rules) (s *story, n int64) {
		if old.hash() == lone.hash() {
			s = anchoredLone(t)
		} else {
			s = anchored(t, old)
		}
		n = s.assess("a", "c", old, old, nil)
		turn := s.assess("a", "b", old, now, nil)
		s.must(s.signOff(turn, "ada", "checker", "approve"))
		if old.hash() != lone.hash() {
			s.must(s.signOff(turn, "bea", "approver", "approve"))
		}
		s.state(turn, Approved)
		return s, n
	}
	t.Run("a role more", func(t *testing.T) {
		s, n := begin(t, lone, ordinary())
		s.must(s.signOff(n, "eva", "checker", "approve"))
		if got := s.state(n, Partly); !slices.Equal(got.Missing, []string{"approver (0 of 1)"}) {
			t.Errorf("missing %v", got.Missing)
		}
		s.refused(s.signOff(n, "eva", "approver", "approve"), "eva@tarn.example signed as checker")
		s.refused(s.signOff(n, "dan", "approver", "approve"), "dan@tarn.example prepared the change")
		s.must(s.signOff(n, "bea", "approver", "approve"))
		s.state(n, Approved)
	})
	t.Run("one person more", func(t *testing.T) {
		s, n := begin(t, ordinary(), ordinary().role("checker 2 preparer"))
		s.must(s.signOff(n, "ada", "checker", "approve"))
		s.must(s.signOff(n, "bea", "approver", "approve"))
		if got := s.state(n, Partly); !slices.Equal(got.Missing, []string{"checker (1 of 2)"}) {
			t.Errorf("missing %v", got.Missing)
		}
		s.must(s.signOff(n, "eva", "checker", "approve"))
		s.state(n, Approved)
	})
	t.Run("a signer less", func(t *testing.T) {
		s, n := begin(t, ordinary(), ordinary().role("approver 1 preparer,checker bea"))
		s.must(s.signOff(n, "ada", "checker", "approve"))
		s.refused(s.signOff(n, "eva", "approver", "approve"), "by the newest approved policy: eva@tarn.example is no signer of the role approver")
		s.must(s.signOff(n, "bea", "approver", "approve"))
		s.state(n, Approved)
	})
	t.Run("a role that has gone", func(t *testing.T) {
		s, n := begin(t, ordinary(), lone)
		s.must(s.signOff(n, "ada", "checker", "approve"))
		s.refused(s.signOff(n, "bea", "approver", "approve"), "by the newest approved policy: it has no role \"approver\"")
		s.state(n, Partly)
	})
	t.Run("independence", func(t *testing.T) {
		loose := ordinary().role("approver 1 -")
		s, n := begin(t, loose, ordinary())
		s.must(s.signOff(n, "ada", "checker", "approve"))
		s.refused(s.signOff(n, "ada", "approver", "approve"), "by the newest approved policy: ada@tarn.example signed as checker")
		s.refused(s.signOff(n, "dan", "approver", "approve"), "by the newest approved policy: dan@tarn.example prepared the change")
	})
	t.Run("what was signed before the turn counts by it only", func(t *testing.T) {
		loose := ordinary().role("approver 1 -")
		s := anchored(t, loose)
		n, turn := s.assess("a", "c", loose, loose, nil), s.assess("a", "b", loose, ordinary(), nil)
		s.must(s.signOff(n, "dan", "approver", "approve")) // who prepared it
		s.must(s.signOff(turn, "ada", "checker", "approve"))
		s.must(s.signOff(turn, "bea", "approver", "approve"))
		s.must(s.signOff(n, "ada", "checker", "approve"))
		if got := s.state(n, Partly); !slices.Equal(got.Missing, []string{"approver (0 of 1)"}) {
			t.Errorf("missing %v", got.Missing)
		}
		s.must(s.signOff(n, "bea", "approver", "approve"))
		s.state(n, Approved)
	})
	t.Run("what was complete before the turn stays approved", func(t *testing.T) {
		s := anchoredLone(t)
		n, turn := s.assess("a", "c", lone, lone, nil), s.assess("a", "b", lone, ordinary(), nil)
		s.must(s.signOff(n, "ada", "checker", "approve"))
		s.must(s.signOff(turn, "ada", "checker", "approve"))
		if got := s.state(n, Approved); len(got.Missing) > 0 {
			t.Errorf("missing %v", got.Missing)
		}
	})
	t.Run("a role more, for somebody whom only the new policy has", func(t *testing.T) {
		few := ordinary().without("eva")
		now := ordinary().role("safety 1 - eva")
		s, n := begin(t, few, now)
		s.must(s.signOff(n, "ada", "checker", "approve"))
		s.must(s.signOff(n, "bea", "approver", "approve"))
		if got := s.state(n, Partly); !slices.Equal(got.Missing, []string{"safety (0 of 1)"}) {
			t.Errorf("missing %v", got.Missing)
		}
		s.must(s.signOff(n, "eva", "safety", "approve"))
		s.state(n, Approved)
	})
	t.Run("one person more for a while", func(t *testing.T) {
		more := ordinary().role("approver 2 preparer,checker")
		s, n := begin(t, ordinary(), more)
		s.must(s.signOff(n, "ada", "checker", "approve"))
		s.must(s.signOff(n, "bea", "approver", "approve"))
		s.state(n, Partly)
		back := s.assess("b", "d", more, ordinary(), nil)
		s.must(s.signOff(back, "ada", "checker", "approve"))
		s.must(s.signOff(back, "bea", "approver", "approve"))
		s.must(s.signOff(back, "eva", "approver", "approve"))
		s.state(back, Approved)
		s.must(s.signOff(n, "bea", "approver", "approve")) // once more, by the policy of now
		s.state(n, Approved)
	})
	t.Run("a rejection that is cleared after the turn", func(t *testing.T) {
		s := anchored(t, ordinary())
		n, turn := s.assess("a", "c", ordinary(), ordinary(), nil), s.assess("a", "b", ordinary(), ordinary().role("approver 2 preparer,checker"), nil)
		s.must(s.signOff(n, "fin", "checker", "reject"))
		s.must(s.signOff(n, "ada", "checker", "approve"))
		s.must(s.signOff(n, "bea", "approver", "approve"))
		s.must(s.signOff(turn, "ada", "checker", "approve"))
		s.must(s.signOff(turn, "bea", "approver", "approve"))
		s.must(s.signOff(n, "fin", "checker", "approve"))
		if got := s.state(n, Partly); !slices.Equal(got.Missing, []string{"approver (1 of 2)"}) {
			t.Errorf("missing %v", got.Missing)
		}
		s.must(s.signOff(n, "eva", "approver", "approve"))
		s.state(n, Approved)
	})
}

// Who is called otherwise since, or has another address, is the same person: he does
// not sign his own change in a role that only the newest policy has.
func TestPreparerUnderAnotherName(t *testing.T) {
	now := func(people ...string) rules {
		r := ordinary().role("assessor 1 preparer eva," + strings.Join(people, ","))
		r.people, r.keys = append([]string{"ada", "bea", "cem", "eva", "fin"}, people...), append([]string{"ada", "bea", "cem", "eva", "fin"}, people...)
		return r
	}
	begin := func(t *testing.T, newest rules, edit func(*Assessment)) (s *story, n int64) {
		s = anchored(t, ordinary())
		s.approve(s.assess("a", "b", ordinary(), newest, nil))
		return s, s.assess("a", "c", ordinary(), ordinary(), edit)
	}
	t.Run("another principal", func(t *testing.T) {
		s, n := begin(t, now("dax"), nil)
		s.refused(s.signOff(n, "dax", "assessor", "approve"), "whether dax@tarn.example prepared the change cannot be told: dan@tarn.example is no person of this policy")
		s.must(s.signOff(n, "ada", "checker", "approve"))
		s.must(s.signOff(n, "bea", "approver", "approve"))
		if got := s.state(n, Partly); !slices.Equal(got.Missing, []string{"assessor (0 of 1)"}) {
			t.Errorf("missing %v", got.Missing)
		}
	})
	t.Run("another address", func(t *testing.T) {
		// The address that dan has in the base's policy is nobody's in the newest.
		s, n := begin(t, now("dan"), func(a *Assessment) { a.Preparers = []string{"dan@elsewhere.example"} })
		sign, keys := ordinary().files()
		a := s.line.Assessment(n)
		a.Policy = s.line.Policy(strings.Replace(sign, "dan@Users.Example", "dan@elsewhere.example", 1), keys)
		if email, known, ok := a.hand(s.line.Newest(".").Parsed, "dan@tarn.example"); !ok || !known || email != "dan@elsewhere.example" {
			t.Error(email, known, ok)
		}
		if _, _, ok := a.hand(s.line.Newest(".").Parsed, "eva@tarn.example"); ok {
			t.Error("somebody whom the base knows has prepared nothing")
		}
	})
	t.Run("an address that changed hands", func(t *testing.T) {
		// The base has it as bea's, the newest policy as ada's: it may be of either.
		s := anchored(t, ordinary())
		sign, keys := ordinary().files()
		moved := strings.Replace(strings.Replace(sign, "bea@Users.Example", "bea@elsewhere.example", 1), "ada@Users.Example", "bea@Users.Example", 1)
		s.approve(s.assess("a", "b", ordinary(), ordinary(), func(a *Assessment) { a.Next = s.line.Policy(moved, keys) }))
		n := s.assess("a", "c", ordinary(), ordinary(), func(a *Assessment) { a.Preparers = []string{"bea@users.example"} })
		s.refused(s.signOff(n, "bea", "checker", "approve"), "bea@tarn.example prepared the change")
		s.refused(s.signOff(n, "ada", "checker", "approve"), "by the newest approved policy: ada@tarn.example prepared the change")
		s.must(s.signOff(n, "eva", "checker", "approve"))
	})
	t.Run("where both policies know the preparer", func(t *testing.T) {
		s, n := begin(t, now("dan", "zed"), nil)
		s.refused(s.signOff(n, "dan", "assessor", "approve"), "dan@tarn.example prepared the change")
		s.must(s.signOff(n, "zed", "assessor", "approve"))
		s.must(s.signOff(n, "ada", "checker", "approve"))
		s.must(s.signOff(n, "bea", "approver", "approve"))
		s.state(n, Approved)
	})
}
