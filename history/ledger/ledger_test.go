package ledger

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"

	"speedtrail/history/canon"
	"speedtrail/history/chain"
)

var when = time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)

func now() time.Time { return when }

func open(t testing.TB, file string) *Ledger {
	t.Helper()
	l, err := Open(t.Context(), file, Options{Create: true, Now: now})
	if err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { l.Close() })
	return l
}

// record makes an assessment with some changes.
func record(name string, changes int) Record {
	body, err := canon.Marshal(map[string]any{"name": name})
	if err != nil {
		panic(err)
	}
	return Record{
		Digest: fmt.Sprintf("%064x", []byte(name)), Body: body, Base: strings.Repeat("a", 40), Target: strings.Repeat("b", 40),
		Folder: ".", Dataset: "Test", RulesVersion: 1,
		Requests:  []Request{{"CR-1", "First"}, {"CR-2", "Second; \"quoted\""}},
		Preparers: []Person{{"Ada", "ada@example.example"}},
		Findings:  []Finding{{ID: "outside", Route: "R1", Direction: "nominal", From: "1.000", To: "2.000", Text: "text"}},
		Changes: func(yield func(Change) bool) {
			for i := range changes {
				if !yield(Change{"R1", "nominal", fmt.Sprintf("T%d", i), "31.180#2", "32.000", 820_000, 90, 110, i%2 == 1, "a:1 basic 90", "a:1 basic 110"}) {
					return
				}
			}
		},
	}
}

func TestRecord(t *testing.T) {
	name := "led?ger#1%.db"
	if runtime.GOOS == "windows" {
		name = "led#ger 1%.db" // no name there has a question mark
	}
	l := open(t, filepath.Join(t.TempDir(), "a folder", name))
	in, err := l.RecordAssessment(t.Context(), when, record("one", 45))
	if err != nil || in.Number != 1 || !in.Added || in.Head.Seq != 2 {
		t.Fatal(in, err)
	}
	again, err := l.RecordAssessment(t.Context(), when.Add(time.Hour), record("one", 45))
	if err != nil || again != (Recorded{1, false, in.Head}) {
		t.Fatal("the same assessment was added again:", again, err)
	}
	if two, err := l.RecordAssessment(t.Context(), when, record("two", 0)); err != nil || two.Number != 2 {
		t.Fatal(two, err)
	}
	row, e, err := l.Assessment(t.Context(), 1)
	if err != nil || string(e.Body) != `{"name":"one"}` || row.Changes != 45 || row.Findings != 1 || row.Entry != in.Head {
		t.Fatal(row, string(e.Body), err)
	}
	list, err := l.Assessments(t.Context())
	if err != nil || len(list) != 2 || list[0].Number != 2 || !slices.Equal(list[0].Requests, []string{"CR-1", "CR-2"}) {
		t.Fatal(list, err)
	}
	if _, _, err := l.Assessment(t.Context(), 3); !errors.Is(err, ErrNoAssessment) {
		t.Fatal(err)
	}
	if err := wholeChain(t.Context(), l); err != nil {
		t.Fatal(err)
	}
}

func wholeChain(ctx context.Context, l *Ledger) error {
	last, err := l.Head(ctx)
	if err != nil {
		return err
	}
	var head chain.Head
	for seq := range last.Seq {
		e, err := l.Entry(ctx, seq+1)
		if err != nil {
			return err
		}
		if err := chain.Check(head, e); err != nil {
			return err
		}
		head = e.Head()
	}
	return nil
}

// program finds a program that a check needs.
func program(t testing.TB, name string) string {
	t.Helper()
	path, err := exec.LookPath(name)
	if err != nil {
		if os.Getenv("CI") == "true" {
			t.Fatal(err)
		}
		t.Skipf("the %s program is not installed", name)
	}
	return path
}

// The rows as the sqlite3 program sees them.
func TestAgainstSQLite3(t *testing.T) {
	sqlite := program(t, "sqlite3")
	file := filepath.Join(t.TempDir(), "ledger.db")
	l := open(t, file)
	if _, err := l.RecordAssessment(t.Context(), when, record("one", 41)); err != nil {
		t.Fatal(err)
	}
	query := func(q string) string {
		out, err := exec.Command(sqlite, "-batch", file, q).CombinedOutput()
		if err != nil {
			t.Fatalf("%s: %v: %s", q, err, out)
		}
		return strings.TrimSpace(string(out))
	}
	for _, test := range []struct{ query, want string }{
		{"PRAGMA integrity_check", "ok"},
		{"PRAGMA foreign_key_check", ""},
		{"PRAGMA application_id", fmt.Sprint(applicationID)},
		{"PRAGMA user_version", "2"},
		{"PRAGMA journal_mode", "delete"},
		{"SELECT seq, time, kind, length(hash) FROM entry", "1|2026-03-01T12:00:00Z|ledger|64\n2|2026-03-01T12:00:00Z|assessment|64"},
		{"SELECT number, entry, folder, dataset, rules_version, speed_changes, findings FROM assessment", "1|2|.|Test|1|41|1"},
		{"SELECT place, id, title FROM request", "1|CR-1|First\n2|CR-2|Second; \"quoted\""},
		{"SELECT name, email FROM preparer", "Ada|ada@example.example"},
		{"SELECT id, route, direction, from_km, to_km, text, accepted FROM finding", "outside|R1|nominal|1.000|2.000|text|"},
		{"SELECT count(*), min(place), max(place), sum(run_out), sum(length_mm) FROM speed_change", "41|1|41|20|33620000"},
		{"SELECT * FROM speed_change WHERE place = 41", "1|41|R1|nominal|T40|31.180#2|32.000|820000|90|110|0|a:1 basic 90|a:1 basic 110"},
	} {
		if got := query(test.query); got != test.want {
			t.Errorf("%s: got %q, want %q", test.query, got, test.want)
		}
	}
	// Append only: every table refuses changes, the ways round included.
	for _, table := range []string{"entry", "assessment", "request", "preparer", "speed_change", "finding"} {
		for _, q := range []string{"DELETE FROM " + table, "UPDATE " + table + " SET rowid = rowid", "REPLACE INTO " + table + " SELECT * FROM " + table} {
			if strings.Contains(q, "rowid") && table != "entry" && table != "assessment" {
				q = "UPDATE " + table + " SET place = place"
			}
			out, err := exec.Command(sqlite, "-batch", file, "PRAGMA recursive_triggers=off; "+q).CombinedOutput()
			if err == nil || !strings.Contains(string(out), "append only") {
				t.Errorf("%s: %v %s", q, err, out)
			}
		}
	}
}

// The chain of a ledger recomputed with the sqlite3, sha256sum and jq programs
// from the comment of package chain.
func TestChainAgainstPrograms(t *testing.T) {
	sqlite := program(t, "sqlite3")
	program(t, "sha256sum")
	jq := program(t, "jq")
	shell := program(t, "bash")
	file := filepath.Join(t.TempDir(), "ledger.db")
	l := open(t, file)
	for i := range 3 {
		if _, err := l.RecordAssessment(t.Context(), when, record(fmt.Sprint("a", i), 2)); err != nil {
			t.Fatal(err)
		}
	}
	script := `set -euo pipefail
"$1" -json "$2" 'SELECT seq, time, kind, hex(body) AS body, previous, hash FROM entry ORDER BY seq' | "$3" -r '.[] | [.seq, .time, .kind, .body, .previous, .hash] | @tsv' |
while IFS=$'\t' read -r seq time kind body previous hash; do
  sum=$(printf '%b' "$(sed 's/../\\x&/g' <<<"$body")" | sha256sum | cut -c1-64)
  got=$(printf 'speedtrail-entry 1\n%s\n%s\n%s\n%s\n%s\n' "$seq" "$time" "$kind" "$sum" "$previous" | sha256sum | cut -c1-64)
  [ "$got" = "$hash" ] && echo "$seq good"
done`
	out, err := exec.Command(shell, "-c", script, "bash", sqlite, file, jq).CombinedOutput()
	if err != nil || string(out) != "1 good\n2 good\n3 good\n4 good\n" {
		t.Fatalf("%v: %s", err, out)
	}
}

func TestOpenRefuses(t *testing.T) {
	dir := t.TempDir()
	good := filepath.Join(dir, "good.db")
	open(t, good).Close()
	alter := func(name string, statements ...string) string {
		file := filepath.Join(dir, name)
		content, err := os.ReadFile(good)
		if err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(file, content, 0o600); err != nil {
			t.Fatal(err)
		}
		db, err := sql.Open("sqlite3", file)
		if err != nil {
			t.Fatal(err)
		}
		defer db.Close()
		for _, s := range statements {
			if _, err := db.Exec(s); err != nil {
				t.Fatal(s, err)
			}
		}
		return file
	}
	write := func(name, content string) string {
		file := filepath.Join(dir, name)
		if err := os.WriteFile(file, []byte(content), 0o600); err != nil {
			t.Fatal(err)
		}
		return file
	}
	link := filepath.Join(dir, "link.db")
	if err := os.Symlink(good, link); err != nil {
		t.Skip("no symbolic links here: ", err)
	}
	content, _ := os.ReadFile(good)
	tests := []struct {
		name, file string
		want       error
	}{
		{"missing", filepath.Join(dir, "none.db"), ErrNoLedger},
		{"empty", write("empty.db", ""), ErrNoLedger},
		{"text", write("text.db", strings.Repeat("no database\n", 100)), ErrForeign},
		{"folder", dir, ErrForeign},
		{"symbolic link", link, ErrSymlink},
		{"newer format", alter("newer.db", "PRAGMA user_version = 3"), ErrNewer},
		{"other program", alter("other.db", "PRAGMA application_id = 1"), ErrForeign},
		{"foreign table", alter("table.db", "CREATE TABLE x (y)"), ErrForeign},
		{"foreign view", alter("view.db", "CREATE VIEW speed AS SELECT 1"), ErrForeign},
		{"foreign index", alter("index.db", "CREATE INDEX i ON entry (time)"), ErrForeign},
		{"foreign trigger", alter("trigger.db", "CREATE TRIGGER t AFTER INSERT ON entry BEGIN SELECT 1; END"), ErrForeign},
		{"trigger taken away", alter("dropped.db", "DROP TRIGGER entry_delete"), ErrForeign},
		{"trigger replaced", alter("replaced.db", "DROP TRIGGER entry_delete", "CREATE TRIGGER entry_delete BEFORE DELETE ON entry BEGIN SELECT 1; END"), ErrForeign},
		{"cut short", write("short.db", string(content[:len(content)/2])), ErrDamaged},
		{"below a file", filepath.Join(good, "ledger.db"), ErrReadOnly},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			before, _ := os.ReadFile(test.file)
			l, err := Open(t.Context(), test.file, Options{ReadOnly: true})
			if err == nil {
				l.Close()
			}
			if !errors.Is(err, test.want) {
				t.Fatalf("got %v, want %v", err, test.want)
			}
			var hint interface{ Hint() string }
			if !errors.As(err, &hint) || hint.Hint() == "" {
				t.Error("no hint")
			}
			if after, _ := os.ReadFile(test.file); string(after) != string(before) {
				t.Error("the file was altered")
			}
		})
	}
}

func TestReadOnly(t *testing.T) {
	file := filepath.Join(t.TempDir(), "ledger.db")
	open(t, file).Close()
	l, err := Open(t.Context(), file, Options{ReadOnly: true})
	if err != nil {
		t.Fatal(err)
	}
	defer l.Close()
	if _, err := l.RecordAssessment(t.Context(), when, record("one", 1)); !errors.Is(err, ErrReadOnly) {
		t.Fatal(err)
	}
}

func TestLockedByAnother(t *testing.T) {
	file := filepath.Join(t.TempDir(), "ledger.db")
	first := open(t, file)
	second, err := Open(t.Context(), file, Options{Wait: 50 * time.Millisecond})
	if err != nil {
		t.Fatal(err)
	}
	defer second.Close()
	if err := first.exec(t.Context(), "BEGIN IMMEDIATE"); err != nil {
		t.Fatal(err)
	}
	if _, err := second.RecordAssessment(t.Context(), when, record("one", 1)); !errors.Is(err, ErrLocked) {
		t.Fatal(err)
	}
	if err := first.exec(t.Context(), "ROLLBACK"); err != nil {
		t.Fatal(err)
	}
	if _, err := second.RecordAssessment(t.Context(), when, record("one", 1)); err != nil {
		t.Fatal("after the lock was given up:", err)
	}
}

// A disk that fills up in the middle leaves the ledger as it was.
func TestFull(t *testing.T) {
	file := filepath.Join(t.TempDir(), "ledger.db")
	l := open(t, file)
	head, err := l.Head(t.Context())
	if err != nil {
		t.Fatal(err)
	}
	if err := l.exec(t.Context(), "PRAGMA max_page_count = 60"); err != nil {
		t.Fatal(err)
	}
	if _, err := l.RecordAssessment(t.Context(), when, record("big", 20_000)); !errors.Is(err, ErrFull) {
		t.Fatal(err)
	}
	if after, err := l.Head(t.Context()); err != nil || after != head {
		t.Fatal(after, err)
	}
	if list, err := l.Assessments(t.Context()); err != nil || len(list) != 0 {
		t.Fatal("a part of the assessment stayed:", list, err)
	}
	if err := l.exec(t.Context(), "PRAGMA max_page_count = 1000000"); err != nil {
		t.Fatal(err)
	}
	if in, err := l.RecordAssessment(t.Context(), when, record("big", 20_000)); err != nil || in.Number != 1 {
		t.Fatal(in, err)
	}
}

func TestCancelled(t *testing.T) {
	l := open(t, filepath.Join(t.TempDir(), "ledger.db"))
	ctx, cancel := context.WithCancel(t.Context())
	r := record("one", 1000)
	inner := r.Changes
	count := 0
	r.Changes = func(yield func(Change) bool) {
		for c := range inner {
			if count++; count == 1500 { // the second run over the changes is the one that writes
				cancel()
			}
			if !yield(c) {
				return
			}
		}
	}
	if _, err := l.RecordAssessment(ctx, when, r); !errors.Is(err, context.Canceled) {
		t.Fatal(err)
	}
	if list, err := l.Assessments(t.Context()); err != nil || len(list) != 0 {
		t.Fatal(list, err)
	}
}

// childEnv names the file in which a child process records.
const childEnv = "SPEEDTRAIL_TEST_LEDGER"

func TestMain(m *testing.M) {
	if file := os.Getenv(childEnv); file != "" {
		os.Exit(child(file, os.Getenv(childEnv+"_NAME")))
	}
	os.Exit(m.Run())
}

// child records assessments until it is done or killed, and names each that was
// reported as recorded.
func child(file, name string) int {
	l, err := Open(context.Background(), file, Options{Create: true, Now: now, Wait: time.Minute})
	if err != nil {
		fmt.Println("error", err)
		return 1
	}
	defer l.Close()
	for i := range 20 {
		in, err := l.RecordAssessment(context.Background(), when, record(fmt.Sprint(name, "-", i), 30))
		if err != nil {
			fmt.Println("error", err)
			return 1
		}
		fmt.Println("recorded", in.Number, in.Head)
	}
	return 0
}

func startChild(t *testing.T, file, name string) *exec.Cmd {
	cmd := exec.Command(os.Args[0])
	cmd.Env = append(os.Environ(), childEnv+"="+file, childEnv+"_NAME="+name, "GORACE=atexit_sleep_ms=0") // no waiting at the end under the race detector
	return cmd
}

// Several processes make the ledger and record at once: all is there, every
// number once, the chain whole.
func TestProcessesAtOnce(t *testing.T) {
	for _, processes := range []int{2, 8} {
		t.Run(fmt.Sprint(processes), func(t *testing.T) {
			file := filepath.Join(t.TempDir(), "ledger.db")
			var group sync.WaitGroup
			outputs := make([][]byte, processes)
			for i := range processes {
				group.Go(func() { outputs[i], _ = startChild(t, file, fmt.Sprint("p", i)).Output() })
			}
			group.Wait()
			for i, out := range outputs {
				if n := strings.Count(string(out), "recorded"); n != 20 {
					t.Errorf("process %d recorded %d: %s", i, n, out)
				}
			}
			l := open(t, file)
			list, err := l.Assessments(t.Context())
			if err != nil || len(list) != 20*processes || list[0].Number != int64(20*processes) {
				t.Fatal(len(list), err)
			}
			if err := wholeChain(t.Context(), l); err != nil {
				t.Fatal(err)
			}
		})
	}
}

// A process that is killed while it records leaves each entry whole or not at
// all, and everything that it reported as recorded.
func TestKill(t *testing.T) {
	file := filepath.Join(t.TempDir(), "ledger.db")
	reported := 0
	for round := range 12 {
		cmd := startChild(t, file, fmt.Sprint("k", round))
		out := new(strings.Builder)
		cmd.Stdout = out
		if err := cmd.Start(); err != nil {
			t.Fatal(err)
		}
		time.Sleep(time.Duration(3+round*7) * time.Millisecond)
		_ = cmd.Process.Kill()
		_ = cmd.Wait()
		reported += strings.Count(out.String(), "recorded")
		l, err := Open(t.Context(), file, Options{Create: true, Now: now})
		if err != nil {
			t.Fatal("round", round, err)
		}
		if err := wholeChain(t.Context(), l); err != nil {
			t.Fatal("round", round, err)
		}
		list, err := l.Assessments(t.Context())
		if err != nil || len(list) < reported {
			t.Fatalf("round %d: %d reported, %d there, %v", round, reported, len(list), err)
		}
		for _, a := range list {
			var rows int
			if err := l.conn.QueryRowContext(t.Context(), "SELECT count(*) FROM speed_change WHERE assessment = ?", a.Number).Scan(&rows); err != nil || rows != 30 {
				t.Fatal("half an assessment:", rows, err)
			}
		}
		l.Close()
	}
}

// A journal that a killed process left is played back when the ledger is opened.
func TestLeftOverJournal(t *testing.T) {
	dir := t.TempDir()
	file := filepath.Join(dir, "ledger.db")
	l := open(t, file)
	if err := l.exec(t.Context(), "PRAGMA cache_size = 5", "BEGIN IMMEDIATE"); err != nil {
		t.Fatal(err)
	}
	if err := l.insertRows(t.Context(), 1, 1, record("spilled", 20_000)); err != nil {
		t.Fatal(err)
	}
	// With so small a cache, part of the work is in the file already.
	copied := filepath.Join(dir, "copied.db")
	for _, suffix := range []string{"", "-journal"} {
		content, err := os.ReadFile(file + suffix)
		if err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(copied+suffix, content, 0o600); err != nil {
			t.Fatal(err)
		}
	}
	c, err := Open(t.Context(), copied, Options{})
	if err != nil {
		t.Fatal(err)
	}
	defer c.Close()
	if list, err := c.Assessments(t.Context()); err != nil || len(list) != 0 {
		t.Fatal(list, err)
	}
	if err := wholeChain(t.Context(), c); err != nil {
		t.Fatal(err)
	}
}

// Writing a large assessment against .import of the sqlite3 program.
func BenchmarkRecord(b *testing.B) {
	const rows = 100_000
	for b.Loop() {
		l, err := Open(b.Context(), filepath.Join(b.TempDir(), "ledger.db"), Options{Create: true, Now: now})
		if err != nil {
			b.Fatal(err)
		}
		if _, err := l.RecordAssessment(b.Context(), when, record("bench", rows)); err != nil {
			b.Fatal(err)
		}
		l.Close()
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/rows, "ns/row")
}

func BenchmarkSQLite3Import(b *testing.B) {
	sqlite := program(b, "sqlite3")
	const rows = 100_000
	dir := b.TempDir()
	var csv strings.Builder
	n := 0
	for c := range record("bench", rows).Changes {
		n++
		fmt.Fprintf(&csv, "1,%d,%s,%s,%s,%s,%s,%d,%d,%d,0,%s,%s\n", n, c.Route, c.Direction, c.Train, c.From, c.To, c.LengthMM, c.Before, c.After, c.BeforeSource, c.AfterSource)
	}
	if err := os.WriteFile(filepath.Join(dir, "rows.csv"), []byte(csv.String()), 0o600); err != nil {
		b.Fatal(err)
	}
	text, _ := migrations.ReadFile("migrations/0001.sql")
	for b.Loop() {
		file := filepath.Join(b.TempDir(), "import.db")
		cmd := exec.Command(sqlite, "-batch", file)
		cmd.Dir = dir
		cmd.Stdin = strings.NewReader("PRAGMA foreign_keys=off;\n" + string(text) + "\n.mode csv\n.import rows.csv speed_change\n")
		if out, err := cmd.CombinedOutput(); err != nil {
			b.Fatal(err, string(out))
		}
	}
	b.ReportMetric(float64(b.Elapsed().Nanoseconds())/float64(b.N)/rows, "ns/row")
}

// What is not committed cannot be computed anew, so that nobody could verify it.
func TestUncommittedIsNotRecorded(t *testing.T) {
	l := open(t, filepath.Join(t.TempDir(), "ledger.db"))
	for _, without := range []func(*Record){func(r *Record) { r.Base = "" }, func(r *Record) { r.Target = "" }} {
		r := record("one", 1)
		without(&r)
		if in, err := l.RecordAssessment(t.Context(), when, r); err == nil {
			t.Errorf("recorded: %+v", in)
		}
	}
	if head, err := l.Head(t.Context()); err != nil || head.Seq != 1 {
		t.Error(head, err)
	}
}
