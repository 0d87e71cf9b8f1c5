package approval

import (
	"testing"

	"speedtrail/history/signoff"
)

// Whoever may add to a ledger can anchor a folder of his own, with keys of his own under
// the names of others. What is signed with them counts there, and is told apart from
// what the others sign.
func TestElsewhere(t *testing.T) {
	s := anchored(t, ordinary())
	others := ordinary()
	others.keys = []string{"ada2", "bea", "cem2", "dan", "eva", "fin"}
	data := func(_ int, st *signoff.Statement) { st.Folder = "data" }
	s.must(s.anchor("b", others, data, "checker:ada2", "approver:bea", "in-service:cem2"))
	want := func(when, folder, key string, want *Elsewhere) {
		t.Helper()
		r := Record{Statement: signoff.Statement{Folder: folder, Signer: principal(key)}, Fingerprint: fingerprintOf(key)}
		got := s.line.Elsewhere(r)
		if (got == nil) != (want == nil) || got != nil && *got != *want {
			t.Errorf("%s, %s in the folder %s: %v, want %v", when, key, folder, got, want)
		}
	}
	first := &Elsewhere{".", 2}
	want("anchored", "data", "ada2", first)
	want("anchored", "data", "cem2", first)
	want("anchored", "data", "bea", nil)
	want("anchored", "data", "mal", nil) // a name that no other folder knows
	want("anchored", ".", "ada", nil)    // the older folder is not questioned by the later one
	want("anchored", "nowhere", "ada2", nil)

	n := s.assess("a", "c", ordinary(), ordinary().key("ada2"), nil)
	want("assessed", "data", "ada2", first)
	s.approve(n)
	want("after a release that brings the key", "data", "ada2", nil)
	want("after a release that brings the key", "data", "cem2", first)
}
