package approval

import (
	"testing"

	"speedtrail/history/chain"
	"speedtrail/history/signoff"
)

// A key is taken out of use by its owner or by a signer who satisfies a role
// independent of preparer.
func TestRevocationRules(t *testing.T) {
	r := ordinary().role("reader 1 -").key("ada2")
	for name, c := range map[string]struct {
		key, by, role string
		edit          func(*signoff.Statement)
		refuse        string
	}{
		"the owner":                  {"ada", "ada", signoff.Owner, nil, ""},
		"the owner, with another":    {"ada", "ada2", signoff.Owner, nil, ""},
		"not the owner":              {"ada", "bea", signoff.Owner, nil, "bea@tarn.example is not the owner of the key " + fingerprintOf("ada")},
		"the owner of no key":        {"mal", "bea", signoff.Owner, nil, "no policy in this ledger has a key " + fingerprintOf("mal")},
		"a checker":                  {"ada", "bea", "checker", nil, ""},
		"an approver":                {"ada", "bea", "approver", nil, ""},
		"his own key by a role":      {"ada", "ada", "checker", nil, ""},
		"a role of preparers":        {"ada", "bea", "reader", nil, "the role reader is not independent of preparer"},
		"in-service":                 {"ada", "cem", "in-service", nil, "the role in-service is not independent of preparer"},
		"an unknown role":            {"ada", "bea", "boss", nil, `the policy has no role "boss"`},
		"no signer of the role":      {"ada", "bea", "in-service", nil, "bea@tarn.example is no signer of the role in-service"},
		"a stranger":                 {"ada", "mal", "checker", nil, "mal@tarn.example is no person of the policy"},
		"another policy":             {"ada", "bea", "checker", func(st *signoff.Statement) { st.Policy = hexOf("x") }, "the statement names the policy"},
		"a folder without an anchor": {"ada", "bea", "checker", func(st *signoff.Statement) { st.Folder = "data" }, "no policy is anchored for the folder data"},
		"a key of nobody":            {"mal", "bea", "checker", nil, "no policy in this ledger has a key " + fingerprintOf("mal")},
	} {
		t.Run(name, func(t *testing.T) {
			s := newStory(t)
			s.must(s.anchor("a", r, nil, "checker:ada", "approver:bea", "in-service:cem", "reader:fin"))
			st := &signoff.Statement{Kind: signoff.Revocation, Policy: r.hash(), Key: fingerprintOf(c.key), Role: c.role}
			if c.edit != nil {
				c.edit(st)
			}
			err := s.record(chain.Revocation, s.sign(st, c.by, RevocationFormat))
			if c.refuse == "" {
				s.must(err)
				if got, ok := s.line.Revoked(fingerprintOf(c.key)); !ok || got.Entry != s.head {
					t.Error("it does not count")
				}
				return
			}
			s.refused(err, c.refuse)
			if len(s.line.Revocations()) != 0 {
				t.Error("it counts all the same")
			}
		})
	}
}

// Later entries by a revoked key do not count, whatever they are; earlier ones do.
func TestRevoked(t *testing.T) {
	r := ordinary().key("ada2").key("cem2")
	s := anchored(t, r)
	n := s.assess("a", "b", r, r, nil)
	s.approve(n)
	other := s.assess("a", "c", r, r, nil)
	s.must(s.signOff(other, "ada", "checker", "approve"))
	s.must(s.inForce("a", day(1), signoff.AllRoutes, CorrectsNothing))

	s.must(s.revoke("ada", "bea", "checker")) // entry 9
	s.state(n, Approved)
	s.state(other, Partly)
	for _, decision := range []string{"approve", "reject"} {
		s.refused(s.signOff(n, "ada", "checker", decision), "the key "+fingerprintOf("ada")+" was revoked by entry 9: looked at it")
	}
	s.refused(s.revoke("bea", "ada", "checker"), "was revoked by entry 9")
	s.refused(s.revoke("ada", "bea", "checker"), "the key is revoked already, by entry 9")
	// The statement may be older than the revocation: the order of the ledger decides.
	s.refused(s.signOff(n, "ada", "checker", "reject", func(st *signoff.Statement) { st.Head, st.Time = s.line.heads[4], s.line.times[4] }), "was revoked by entry 9")
	// Another key of the same person is not concerned.
	s.must(s.signOff(n, "ada2", "checker", "reject"))
	s.state(n, Rejected)
	s.must(s.signOff(n, "ada2", "checker", "approve"))
	s.state(n, Approved)

	s.must(s.revoke("cem", "cem2", signoff.Owner))
	s.refused(s.inForce("b", day(2), signoff.AllRoutes, CorrectsNothing), "the key "+fingerprintOf("cem")+" was revoked")
	if len(s.line.Standing(".")) != 1 {
		t.Error("what cem recorded before does not stand")
	}
}

// A revocation by a key that is revoked itself later stays.
func TestRevokedRevoker(t *testing.T) {
	s := anchored(t, ordinary())
	s.must(s.revoke("ada", "bea", "checker"))
	s.must(s.revoke("bea", "eva", "checker"))
	n := s.assess("a", "b", ordinary(), ordinary(), nil)
	s.refused(s.signOff(n, "ada", "checker", "approve"), "was revoked")
	s.refused(s.signOff(n, "bea", "approver", "approve"), "was revoked")
}

// A revoked key cannot sign an anchor of another folder.
func TestRevokedAnchor(t *testing.T) {
	s := anchored(t, ordinary())
	s.must(s.revoke("ada", "bea", "checker"))
	s.refused(s.anchor("b", ordinary(), func(_ int, st *signoff.Statement) { st.Folder = "data" }, "checker:ada", "approver:bea", "in-service:cem"), "was revoked")
	s.must(s.anchor("b", ordinary(), func(_ int, st *signoff.Statement) { st.Folder = "data" }, "checker:fin", "approver:bea", "in-service:cem"))
}
