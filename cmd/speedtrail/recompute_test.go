package main

import (
	"path/filepath"
	"strings"
	"testing"
	"time"

	"speedtrail/history/assessment"
	"speedtrail/history/ledger"
)

// Who signs an assessment signs what his own computer makes of the revisions. An entry
// that says something else of them has a good chain and good rows all the same.
func TestSignComputesAnew(t *testing.T) {
	file, in, key := aLedger(t)
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	call(t, in("assess", "c0", "c1")...).want(t, statusFinding)
	l, err := ledger.Open(t.Context(), file, ledger.Options{})
	if err != nil {
		t.Fatal(err)
	}
	_, e, err := l.Assessment(t.Context(), 1)
	if err != nil {
		t.Fatal(err)
	}
	doc, _, err := assessment.Decode(e.Body)
	if err != nil || len(doc.Computed.Findings) == 0 {
		t.Fatal(doc, err)
	}
	doc.Computed.Findings = doc.Computed.Findings[:0]
	body, digest, err := doc.Encode()
	if err != nil {
		t.Fatal(err)
	}
	forged, err := l.RecordAssessment(t.Context(), time.Now(), assessment.LedgerRecord(doc, body, digest))
	if err != nil {
		t.Fatal(err)
	}
	if err := l.Close(); err != nil {
		t.Fatal(err)
	}
	statement := filepath.Join(t.TempDir(), "statement")
	sign := func(number string, args ...string) called {
		return call(t, in(append([]string{"sign", number}, args...)...)...)
	}
	decide := func(more ...string) []string {
		return append([]string{"--role", "checker", "--decision", "approve", "--reason", "looked at it", "--key", key("ada"), "-y"}, more...)
	}
	sign("1", decide("--write", statement)...).want(t, 0)
	for what, got := range map[string]called{
		"computed anew the assessment has another digest": sign("2", decide()...).want(t, statusInput),
		"computed anew":      sign("2", decide("--write", statement+"2")...).want(t, statusInput),
		"has another digest": sign("2", "--statement", statement, "--signature", statement+".sig").want(t, statusInput),
	} {
		if !strings.Contains(got.errors, what) {
			t.Errorf("%q: %s", what, got.errors)
		}
	}
	if got := headOf(t, call(t, in("assess", "c0", "c1")...)); got != forged.Head.String() {
		t.Errorf("something was recorded: %s after %s", got, forged.Head)
	}
	// A statement is brought for the assessment that it is about.
	call(t, in("assess", "c1", "c2")...).want(t, statusFinding)
	if got := sign("3", "--statement", statement, "--signature", statement+".sig").want(t, statusInput); !strings.Contains(got.errors, "the statement is about assessment 1, not 3") {
		t.Error(got.errors)
	}
	sign("1", "--statement", statement, "--signature", statement+".sig").want(t, 0)
}
