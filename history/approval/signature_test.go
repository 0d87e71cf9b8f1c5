package approval

import (
	"errors"
	"testing"

	"speedtrail/history/chain"
	"speedtrail/history/signoff"
)

// A statement whose signature is one over another, or by another key, does not
// count, whatever its kind; with its own it does (signoff.md, Signing).
func TestFalseSignatures(t *testing.T) {
	for kind, c := range map[chain.Kind]struct {
		format, key string
		statement   func(s *story) *signoff.Statement
	}{
		chain.SignOff: {SignOffFormat, "ada", func(s *story) *signoff.Statement { return s.statementOf(1, "checker", "approve") }},
		chain.InForce: {InForceFormat, "cem", func(*story) *signoff.Statement {
			return &signoff.Statement{Kind: signoff.InForce, Revision: commitOf("a"), Content: treeOf("a"), Policy: ordinary().hash(), Since: begin, Corrects: CorrectsNothing, Role: InServiceRole}
		}},
		chain.Revocation: {RevocationFormat, "bea", func(*story) *signoff.Statement {
			return &signoff.Statement{Kind: signoff.Revocation, Policy: ordinary().hash(), Key: fingerprintOf("ada"), Role: "checker"}
		}},
	} {
		t.Run(string(kind), func(t *testing.T) {
			s := anchored(t, ordinary())
			n := s.assess("a", "b", ordinary(), ordinary(), nil)
			made := func() (good, other Signed) {
				st := c.statement(s)
				good = s.sign(st, c.key, c.format)
				st.Reason = "looked at something else"
				return good, s.sign(st, c.key, c.format)
			}
			none := func(what string) {
				t.Helper()
				if len(s.line.SignOffs()) != 0 || len(s.line.InForce()) != 0 || len(s.line.Revocations()) != 0 {
					t.Errorf("%s counts", what)
				}
			}
			good, other := made()
			err := s.record(kind, Signed{Format: c.format, Statement: good.Statement, Signature: other.Signature})
			if s.refused(err, "it is not one over this statement"); !errors.Is(err, signoff.ErrSignature) {
				t.Errorf("%v is no matter of the signature", err)
			}
			none("a signature over another statement")
			good, _ = made()
			s.refused(s.record(kind, Signed{Format: c.format, Statement: good.Statement, Signature: signatureOf(t, "mal", []byte(good.Statement))}), "is not allowed to anyone by this policy")
			good, _ = made()
			s.refused(s.record(kind, Signed{Format: c.format, Statement: good.Statement, Signature: signatureOf(t, "fin", []byte(good.Statement))}), "belongs to fin@tarn.example, not to the signer "+principal(c.key))
			none("a signature by another key")
			s.state(n, Open)
			good, _ = made()
			s.must(s.record(kind, good))
			s.refused(s.record(kind, good), "the statement is recorded already")
		})
	}
}

// What is foreseen for a key is what would be recorded with it; without a key, what
// would be with one that may sign.
func TestForesee(t *testing.T) {
	r := ordinary().key("ada2").key("fin valid-before=\"20260301080000Z\"")
	for name, c := range map[string]struct{ signer, key, refuse string }{
		"his key":          {"ada", "ada", ""},
		"another of his":   {"ada", "ada2", ""},
		"no key said":      {"ada", "", ""},
		"somebody else's":  {"ada", "bea", "belongs to bea@tarn.example, not to the signer ada@tarn.example"},
		"a stranger's":     {"ada", "mal", "is not allowed to anyone by this policy"},
		"a revoked one":    {"eva", "eva", "was revoked by entry 3"},
		"one out of date":  {"fin", "fin", "was valid until 2026-03-01T08:00:00Z"},
		"a preparer, none": {"dan", "", "dan@tarn.example prepared the change"},
	} {
		t.Run(name, func(t *testing.T) {
			s := anchored(t, r)
			s.must(s.revoke("eva", "bea", "checker")) // entry 3
			n := s.assess("a", "b", r, r, nil)
			st := s.statementOf(n, "checker", "approve")
			signed := s.sign(st, c.signer, SignOffFormat) // fills it in
			fingerprint := ""
			if c.key != "" {
				fingerprint = fingerprintOf(c.key)
				signed.Signature = signatureOf(t, c.key, []byte(signed.Statement))
			}
			foreseen := s.line.Foresee(*st, fingerprint, s.now)
			if len(s.line.SignOffs()) != 0 {
				t.Fatal("what is foreseen counts")
			}
			if c.refuse == "" {
				s.must(foreseen)
				s.must(s.record(chain.SignOff, signed))
				return
			}
			s.refused(foreseen, c.refuse)
			if err := s.record(chain.SignOff, signed); err == nil || foreseen == nil || c.key != "" && !errors.Is(err, ErrRefused) {
				t.Errorf("foreseen %v, recorded %v", foreseen, err)
			}
		})
	}
}

// Nor is a statement written for somebody to sign whose key in the base's policy a
// newer one took out.
func TestForeseeWithoutKey(t *testing.T) {
	s := anchored(t, ordinary())
	rotated := ordinary().without("eva").key("eva2")
	s.approve(s.assess("a", "b", ordinary(), rotated, nil))
	other := s.assess("a", "c", ordinary(), ordinary(), nil)
	st := s.statementOf(other, "checker", "approve")
	s.sign(st, "eva", SignOffFormat) // fills it in
	s.refused(s.line.Foresee(*st, "", s.now), "is not allowed to anyone by this policy")
	next := s.statementOf(s.assess("b", "d", rotated, rotated, nil), "checker", "approve")
	s.sign(next, "eva2", SignOffFormat)
	s.must(s.line.Foresee(*next, "", s.now))
}
