package main

import (
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"speedtrail/history/ledger"
	"speedtrail/history/revision"
	"speedtrail/schema"
	"speedtrail/schema/source"
)

// Status 2 is for what the caller can put right, 3 for the machine, the ledger and a
// repository that cannot be read. Of two sides the data counts before the machine.
func TestStatusOf(t *testing.T) {
	faults, machine := error(&source.Faults{}), errors.New("no space left")
	for _, c := range []struct {
		err  error
		want int
	}{
		{nil, 0}, {errFindings, 1}, {badCall("", "x"), 2}, {faults, 2}, {machine, 3}, {context.Canceled, 3},
		{revision.ErrUnknown, 2}, {revision.ErrAmbiguous, 2}, {revision.ErrNotCommit, 2}, {revision.ErrNoFolder, 2}, {revision.ErrBare, 2}, {ledger.ErrNoAssessment, 2},
		{revision.ErrMissingObject, 3}, {revision.ErrShallow, 3}, {ledger.ErrDamaged, 3}, {ledger.ErrForeign, 3}, {ledger.ErrNoLedger, 3},
		{&schema.PairError{Base: faults}, 2}, {&schema.PairError{Target: faults}, 2}, {&schema.PairError{Base: faults, Target: faults}, 2},
		{&schema.PairError{Base: faults, Target: machine}, 2}, {&schema.PairError{Base: machine, Target: faults}, 2},
		{&schema.PairError{Base: machine}, 3}, {&schema.PairError{Target: machine}, 3}, {&schema.PairError{Base: machine, Target: machine}, 3},
	} {
		if got := statusOf(c.err); got != c.want {
			t.Errorf("%v: status %d, want %d", c.err, got, c.want)
		}
		if c.err == nil {
			continue
		}
		if got := statusOf(fmt.Errorf("of something: %w", c.err)); got != c.want {
			t.Errorf("%v in another error: status %d, want %d", c.err, got, c.want)
		}
	}
}

// verify is asked whether something is wrong, and a file that is no ledger, or is
// damaged, is; for every other command the ledger cannot be read.
func TestStatusOfForeignLedger(t *testing.T) {
	dir := t.TempDir()
	good := filepath.Join(dir, "good.db")
	l, err := ledger.Open(t.Context(), good, ledger.Options{Create: true, Now: time.Now})
	if err != nil {
		t.Fatal(err)
	}
	if err := l.Close(); err != nil {
		t.Fatal(err)
	}
	content := readFileOf(t, good)
	for name, content := range map[string][]byte{"none": []byte("no database"), "cut": content[:len(content)/2], "another application's": append(append(content[:68:68], 1, 2, 3, 4), content[72:]...)} {
		file := filepath.Join(dir, name)
		if err := os.WriteFile(file, content, 0o600); err != nil {
			t.Fatal(err)
		}
		call(t, "verify", "--ledger-only", "--ledger", file).want(t, statusFinding)
		if got := call(t, "verify", "--ledger-only", "--ledger", file, "--format", "json").want(t, statusFinding); !strings.Contains(got.out, `"good": false`) || !strings.Contains(got.out, `"kind": "file"`) {
			t.Errorf("%s: %s", name, got.out)
		}
		for _, args := range [][]string{{"register"}, {"report", "1"}, {"inforce"}, {"export"}} {
			call(t, append(args, "--ledger", file)...).want(t, statusFailed)
		}
	}
	call(t, "verify", "--ledger-only", "--ledger", filepath.Join(dir, "not there")).want(t, statusFailed)
	const open = "that the assessments are what Git holds"
	if got := call(t, "verify", "--ledger-only", "--ledger", good).want(t, statusDone); !strings.Contains(got.out, open) {
		t.Errorf("of the ledger only: %s", got.out)
	}
	if got := call(t, "verify", "--ledger", good).want(t, statusDone); strings.Contains(got.out, open) {
		t.Errorf("with the repository: %s", got.out)
	}
}

// What was noted elsewhere and is not there is wrong; what cannot have been noted is a
// call that is.
func TestStatusOfNoted(t *testing.T) {
	file := filepath.Join(t.TempDir(), "ledger.db")
	l, err := ledger.Open(t.Context(), file, ledger.Options{Create: true, Now: time.Now})
	if err != nil {
		t.Fatal(err)
	}
	head, err := l.Head(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	if err := l.Close(); err != nil {
		t.Fatal(err)
	}
	other := strings.Repeat("0", 63) + "1"
	for _, c := range []struct {
		flag, value string
		want        int
	}{
		{"--against", head.String(), statusDone}, {"--against", "1:" + other, statusFinding}, {"--against", "2:" + head.Hash, statusFinding},
		{"--against", head.Hash, statusInput}, {"--against", "1:" + head.Hash[1:], statusInput}, {"--against", "0:" + head.Hash, statusInput}, {"--against", "", statusInput},
		{"--anchor", other, statusFinding}, {"--anchor", head.Hash, statusFinding}, {"--anchor", head.String(), statusInput}, {"--anchor", other[1:], statusInput},
		{"--anchor", strings.Repeat("A", 64), statusInput}, {"--anchor", "", statusInput},
	} {
		call(t, "verify", "--ledger-only", "--ledger", file, c.flag, c.value).want(t, c.want)
	}
}
