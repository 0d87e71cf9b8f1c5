package main

import (
	"database/sql"
	"os"
	"path/filepath"
	"regexp"
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
				if got.status != statusFailed || !strings.Contains(got.errors, "the ledger's file is damaged") || !strings.Contains(got.errors, "verify says more") {
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

// past alters a ledger past its schema, whose text stands there again afterwards.
func past(t *testing.T, file, table, column, statement string) {
	t.Helper()
	db, err := sql.Open("sqlite3", file)
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	var text string
	if err := db.QueryRow("SELECT sql FROM sqlite_schema WHERE name = ?", table).Scan(&text); err != nil {
		t.Fatal(err)
	}
	loose := regexp.MustCompile(`(?m)^(  `+column+` +\w+) NOT NULL`).ReplaceAllString(text, "$1")
	if loose == text {
		t.Fatalf("the column %s may be NULL already\n%s", column, text)
	}
	schema := func(text string) {
		t.Helper()
		db, err := sql.Open("sqlite3", file)
		if err != nil {
			t.Fatal(err)
		}
		defer db.Close()
		db.SetMaxOpenConns(1)
		for _, s := range []string{"PRAGMA writable_schema = ON", "UPDATE sqlite_schema SET sql = '" + strings.ReplaceAll(text, "'", "''") + "' WHERE name = '" + table + "'"} {
			if _, err := db.Exec(s); err != nil {
				t.Fatal(err)
			}
		}
	}
	schema(loose)
	alter(t, file, statement)
	schema(text)
}

// A value that the schema does not allow is damage, whichever it is: verify says
// so with its own status, everything else refuses the ledger.
func TestNullInLedger(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 80, 100}, []time.Time{at, at.Add(time.Hour), at.Add(2 * time.Hour)})
	key := func(name string) string { return filepath.Join(keys, name) }
	template := filepath.Join(repo, ".git", "speedtrail", "ledger.db")
	call(t, "--repo", repo, "anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y").want(t, 0)
	call(t, "--repo", repo, "assess", "c0", "c1").want(t, 1)
	content := readFileOf(t, template)
	for _, c := range []struct{ table, column, where string }{
		{"entry", "time", "seq = 3"}, {"entry", "kind", "seq = 2"}, {"entry", "previous", "seq = 3"}, {"entry", "hash", "seq = 3"}, {"entry", "body", "seq = 3"},
		{"entry", "hash", "seq = 1"}, {"entry", "time", "seq = 1"},
		{"assessment", "digest", "number = 1"}, {"assessment", "entry", "number = 1"}, {"assessment", "base", "number = 1"}, {"assessment", "findings", "number = 1"},
		{"anchor", "role", "place = 2"},
	} {
		t.Run(c.table+"."+c.column+" "+c.where, func(t *testing.T) {
			file := filepath.Join(t.TempDir(), "ledger.db")
			if err := os.WriteFile(file, content, 0o600); err != nil {
				t.Fatal(err)
			}
			past(t, file, c.table, c.column, "UPDATE "+c.table+" SET "+c.column+" = NULL WHERE "+c.where)
			in := func(args ...string) []string { return append([]string{"--repo", repo, "--ledger", file}, args...) }
			for _, format := range []string{"text", "json"} {
				got := call(t, in("verify", "--format", format)...)
				if got.status != statusFinding || !strings.Contains(got.out, "NULL") || strings.Contains(got.out, "Nothing is wrong") || strings.Contains(got.out, `"good": true`) {
					t.Errorf("verify: status %d\n%s%s", got.status, got.out, got.errors)
				}
			}
			if c.table != "entry" || c.column == "body" {
				return
			}
			for _, args := range [][]string{{"register"}, {"export"}, {"inforce"}, {"assess", "c1", "c2"}} {
				if got := call(t, in(args...)...); got.status != statusFailed || !strings.Contains(got.errors, "the ledger's file is damaged") {
					t.Errorf("%q: status %d\n%s%s", args, got.status, got.out, got.errors)
				}
			}
		})
	}
}
