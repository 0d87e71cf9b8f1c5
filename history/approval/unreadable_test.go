package approval

import (
	"testing"

	"speedtrail/history/chain"
	"speedtrail/history/signoff"
)

// A policy that cannot be read is no hindrance to revoking a key, nor does it bring
// one: an assessment of such a target can be recorded by anybody (signoff.md,
// Revocation).
func TestRevocationBesideUnreadablePolicy(t *testing.T) {
	bad := ordinary()
	bad.roles = []string{"checker 1 -"} // none is independent of preparer
	s := anchored(t, ordinary())
	n := s.assess("a", "b", ordinary(), bad.key("mal"), nil)
	if s.line.Assessment(n).Next.Problem == nil {
		t.Fatal("the policy of the target can be read")
	}
	for name, c := range map[string]struct{ key, refuse string }{
		"a key of nobody":      {"zoe", "no policy in this ledger has a key " + fingerprintOf("zoe")},
		"a key of that policy": {"mal", "no policy in this ledger has a key " + fingerprintOf("mal")},
		"a key in use":         {"ada", ""},
	} {
		st := &signoff.Statement{Kind: signoff.Revocation, Policy: s.rules.hash(), Key: fingerprintOf(c.key), Role: "checker"}
		err := s.record(chain.Revocation, s.sign(st, "bea", RevocationFormat))
		if c.refuse == "" {
			s.must(err)
		} else {
			s.refused(err, c.refuse)
		}
		if _, ok := s.line.Revoked(fingerprintOf(c.key)); ok != (c.refuse == "") {
			t.Errorf("%s is revoked: %v", name, ok)
		}
	}
}
