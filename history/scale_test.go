package history_test

import (
	"fmt"
	"path/filepath"
	"runtime"
	"slices"
	"testing"
	"time"

	"speedtrail/history"
	"speedtrail/history/approval"
	"speedtrail/history/assessment"
	"speedtrail/history/canon"
	"speedtrail/history/chain"
	"speedtrail/history/ledger"
	"speedtrail/history/signoff"
)

// longLedger writes a ledger with releases that follow one another, each assessed
// and approved by two people. It is written without asking after each entry: that
// would read the ledger anew each time.
func longLedger(t testing.TB, releases int) *ledger.Ledger {
	t.Helper()
	repo := newRepository()
	repo.commits["r0"] = repo.commits["a"]
	for i := 1; i <= releases; i++ {
		name := fmt.Sprintf("r%d", i)
		repo.commits[name] = commit{parent: fmt.Sprintf("r%d", i-1), tree: name, policy: "P1", authors: []string{"dan@tarn.example"}}
	}
	var entries []ledger.Restored
	var head chain.Head
	add := func(kind chain.Kind, body any, record *ledger.Record) {
		t.Helper()
		b, ok := body.([]byte)
		if !ok {
			var err error
			if b, err = canon.Marshal(body); err != nil {
				t.Fatal(err)
			}
		}
		e := ledger.Restored{Entry: chain.Next(head, begin.Add(time.Duration(head.Seq)*time.Minute), kind, b), Assessment: record}
		if record == nil {
			rows, err := history.SignedRows(e.Entry)
			if err != nil {
				t.Fatal(err)
			}
			e.Rows = rows
		}
		head = e.Head()
		entries = append(entries, e)
	}
	now := func() time.Time { return begin.Add(time.Duration(head.Seq) * time.Minute) }
	add(chain.Ledger, map[string]any{"format": 1, "id": ledgerID}, nil)
	anchor, err := anchorBody("r0", "a", ".", "P1", head, now(), "checker:ada", "approver:bea", "in-service:cem")
	if err != nil {
		t.Fatal(err)
	}
	add(chain.Anchor, anchor, nil)
	for i := 1; i <= releases; i++ {
		d := repo.document(fmt.Sprintf("r%d", i-1), fmt.Sprintf("r%d", i))
		body, digest := encoded(d)
		record := assessment.LedgerRecord(d, body, digest)
		add(chain.Assessment, body, &record)
		a := history.AssessmentOf(approval.New(ledgerID), int64(i), digest, d)
		for _, part := range [][2]string{{"ada", "checker"}, {"bea", "approver"}} {
			text, signature, err := sign(signOffOf(a, part[1], signoff.Approve), part[0], head, now())
			if err != nil {
				t.Fatal(err)
			}
			add(chain.SignOff, approval.Signed{Format: approval.SignOffFormat, Signature: string(signature), Statement: string(text)}, nil)
		}
	}
	file := filepath.Join(quickDir(t), "long.db")
	if _, err := ledger.Restore(t.Context(), file, func(yield func(ledger.Restored, error) bool) {
		for _, e := range entries {
			if !yield(e, nil) {
				return
			}
		}
	}); err != nil {
		t.Fatal(err)
	}
	return openLedger(t, file)
}

// Reading the line of approval takes about as much for each entry however many
// there are. What is counted is memory that was asked for, which does not depend
// on how busy the machine is.
func TestReadLineScales(t *testing.T) {
	cost := func(releases int) (mallocs float64) {
		l := longLedger(t, releases)
		var before, after runtime.MemStats
		start := time.Now()
		runtime.ReadMemStats(&before)
		line, problems, err := history.ReadLine(t.Context(), l)
		runtime.ReadMemStats(&after)
		if err != nil || len(problems) > 0 {
			t.Fatal(problems, err)
		}
		if got := line.State(int64(releases)).Word; got != approval.Approved {
			t.Fatalf("the last release is %s", got)
		}
		if n := len(slices.Collect(func(yield func(int64) bool) {
			for _, a := range line.Assessments() {
				if line.State(a.Number).Word == approval.Approved && !yield(a.Number) {
					return
				}
			}
		})); n != releases {
			t.Fatalf("%d of %d releases are approved", n, releases)
		}
		mallocs = float64(after.Mallocs - before.Mallocs)
		t.Logf("%d assessments with their sign-offs: %v, %.0f allocations", releases, time.Since(start).Round(time.Millisecond), mallocs)
		return mallocs
	}
	few, many := cost(100), cost(400)
	if times := many / few; times > 6 {
		t.Errorf("four times the entries take %.1f times as much: every entry looks at all assessments anew", times)
	}
}
