package main

import (
	"database/sql"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// alter changes a ledger as whoever can write the file could: the triggers are
// taken away and put back.
func alter(t *testing.T, file, statement string) {
	t.Helper()
	db, err := sql.Open("sqlite3", file)
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	rows, err := db.Query("SELECT name, sql FROM sqlite_master WHERE type = 'trigger'")
	if err != nil {
		t.Fatal(err)
	}
	triggers := map[string]string{}
	for rows.Next() {
		var name, text string
		if err := rows.Scan(&name, &text); err != nil {
			t.Fatal(err)
		}
		triggers[name] = text
	}
	if err := rows.Err(); err != nil {
		t.Fatal(err)
	}
	do := func(text string) {
		t.Helper()
		if _, err := db.Exec(text); err != nil {
			t.Fatal(text, err)
		}
	}
	for name := range triggers {
		do("DROP TRIGGER " + name)
	}
	result, err := db.Exec(statement)
	if err != nil {
		t.Fatal(err)
	}
	if n, _ := result.RowsAffected(); n == 0 {
		t.Fatal("nothing was altered")
	}
	for _, text := range triggers {
		do(text)
	}
}

// What is not what was recorded is neither shown nor signed nor added to; verify
// says what it is.
func TestAlteredLedger(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	for name, statement := range map[string]string{
		"a speed":          `UPDATE entry SET body = CAST(replace(CAST(body AS TEXT), '"after_kmh":80', '"after_kmh":85') AS BLOB) WHERE kind = 'assessment'`,
		"the digest's row": `UPDATE assessment SET digest = '` + strings.Repeat("0", 64) + `'`,
		"a row's number":   `UPDATE assessment SET number = 7`,
		"a row more":       `INSERT INTO assessment SELECT 9, 1, 'x' || digest, base, target, folder, dataset, rules_version, speed_changes, findings FROM assessment`,
		"a row's base":     `UPDATE assessment SET base = target`,
		"a row's count":    `UPDATE assessment SET speed_changes = speed_changes - 1`,
		"a row's findings": `UPDATE assessment SET findings = 0`,
		"a row's data set": `UPDATE assessment SET dataset = 'Other'`,
		"a row's request":  `INSERT INTO request SELECT number, 1, 'CR-1', 'Other' FROM assessment`,
		"a time":           `UPDATE entry SET time = '2026-01-01T00:00:00Z' WHERE kind = 'assessment'`,
		"a hash":           `UPDATE entry SET hash = '` + strings.Repeat("0", 64) + `' WHERE kind = 'assessment'`,
	} {
		t.Run(name, func(t *testing.T) {
			keys := t.TempDir()
			repo := composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
			in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
			key := func(name string) string { return filepath.Join(keys, name) }
			call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
			call(t, in("assess", "c0", "c1")...).want(t, 1)
			alter(t, filepath.Join(repo, ".git", "speedtrail", "ledger.db"), statement)
			commands := [][]string{
				{"sign", "1", "--role", "checker", "--decision", "approve", "--reason", "seen", "--key", key("ada"), "-y"},
				{"report", "1"}, {"register"}, {"export"}, {"inforce"}, {"assess", "c0", "c1"},
				{"inforce", "record", "c0", "--since", "2026-03-03T00:00:00Z", "--reason", "start", "--key", key("cem"), "-y"},
			}
			for _, args := range commands {
				if name == "a row's number" && (args[0] == "sign" || args[0] == "report") {
					continue // there is no assessment 1
				}
				got := call(t, in(args...)...)
				if got.status != statusFailed || !strings.Contains(got.errors, "the ledger's file is damaged") || !strings.Contains(got.errors, "speedtrail verify") {
					t.Errorf("%q: status %d\n%s%s", args, got.status, got.out, got.errors)
				}
			}
			got := call(t, in("verify")...)
			if got.status != statusFinding || !strings.Contains(got.out, "!") {
				t.Errorf("verify: status %d\n%s", got.status, got.out)
			}
			// Proved is only what agrees.
			if name == "a speed" && (!strings.Contains(got.out, "computed anew the assessment has the digest") || !strings.Contains(got.out, "proved: 0 of 1 assessments were computed anew")) {
				t.Errorf("verify: %s", got.out)
			}
		})
	}
}
