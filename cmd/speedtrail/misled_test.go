package main

import (
	"bytes"
	"database/sql"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"speedtrail/history/chain"
)

// mislead has the row of assessment 1 name another entry than the index does by which
// it is found: one that is appended, of a kind that nobody takes for an assessment,
// with an altered copy of its body.
func mislead(t *testing.T, file string) {
	t.Helper()
	run := func(work func(db *sql.DB)) {
		t.Helper()
		db, err := sql.Open("sqlite3", file)
		if err != nil {
			t.Fatal(err)
		}
		defer db.Close()
		db.SetMaxOpenConns(1)
		work(db)
	}
	do := func(db *sql.DB, text string, args ...any) {
		t.Helper()
		if _, err := db.Exec(text, args...); err != nil {
			t.Fatal(text, err)
		}
	}
	type object struct {
		kind, name string
		page       int64
		text       sql.NullString
	}
	var table string
	var rest []object
	var e chain.Entry
	run(func(db *sql.DB) {
		var head chain.Head
		var body []byte
		if err := db.QueryRow("SELECT seq, hash FROM entry ORDER BY seq DESC LIMIT 1").Scan(&head.Seq, &head.Hash); err != nil {
			t.Fatal(err)
		}
		if err := db.QueryRow("SELECT e.body FROM entry e JOIN assessment a ON a.entry = e.seq").Scan(&body); err != nil {
			t.Fatal(err)
		}
		altered := bytes.ReplaceAll(body, []byte(`"after_kmh":80`), []byte(`"after_kmh":65`))
		if bytes.Equal(body, altered) {
			t.Fatal("nothing was altered")
		}
		e = chain.Next(head, time.Now(), chain.SignOff, altered)
		do(db, "INSERT INTO entry VALUES (?, ?, ?, ?, ?, ?)", e.Seq, e.Time, string(e.Kind), e.Body, e.Previous, e.Hash)
		rows, err := db.Query("SELECT type, name, rootpage, sql FROM sqlite_schema WHERE tbl_name = 'assessment'")
		if err != nil {
			t.Fatal(err)
		}
		for rows.Next() {
			var o object
			if err := rows.Scan(&o.kind, &o.name, &o.page, &o.text); err != nil {
				t.Fatal(err)
			}
			if o.kind == "table" {
				table = o.text.String
			} else {
				rest = append(rest, o)
			}
		}
		if err := rows.Err(); err != nil {
			t.Fatal(err)
		}
		do(db, "PRAGMA writable_schema = ON")
		do(db, "DELETE FROM sqlite_schema WHERE tbl_name = 'assessment' AND type <> 'table'")
		do(db, "UPDATE sqlite_schema SET sql = ? WHERE name = 'assessment'", strings.ReplaceAll(table, " UNIQUE", ""))
	})
	run(func(db *sql.DB) {
		do(db, "UPDATE assessment SET entry = ?", e.Seq)
		do(db, "PRAGMA writable_schema = ON")
		do(db, "UPDATE sqlite_schema SET sql = ? WHERE name = 'assessment'", table)
		for _, o := range rest {
			do(db, "INSERT INTO sqlite_schema (type, name, tbl_name, rootpage, sql) VALUES (?, ?, 'assessment', ?, ?)", o.kind, o.name, o.page, o.text)
		}
	})
}

// TestRowLeadsElsewhere: what is shown under a state and signatures, and what somebody
// is shown before he signs, is what the state and the signatures are about.
func TestRowLeadsElsewhere(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	key := func(name string) string { return filepath.Join(keys, name) }
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	call(t, in("assess", "c0", "c1")...).want(t, 1)
	call(t, in("report", "1")...).want(t, 0)
	mislead(t, filepath.Join(repo, ".git", "speedtrail", "ledger.db"))
	for _, args := range [][]string{
		{"report", "1"}, {"report", "1", "--format", "json"}, {"register"},
		{"sign", "1", "--role", "checker", "--decision", "approve", "--reason", "seen", "--key", key("ada"), "-y"},
		{"sign", "1", "--role", "checker", "--decision", "approve", "--reason", "seen", "--signer", "ada@tarn.example", "--write", filepath.Join(t.TempDir(), "statement")},
	} {
		got := call(t, in(args...)...)
		if got.status != statusFailed || !strings.Contains(got.errors, "does not lead to its entry") {
			t.Errorf("%q: status %d\n%s%s", args, got.status, got.out, got.errors)
		}
	}
	if got := call(t, in("verify")...); got.status != statusFinding || strings.Contains(got.out, "Nothing is wrong") {
		t.Errorf("verify: status %d\n%s", got.status, got.out)
	}
}

// TestVerifyOfGoneCommit: what is wrong is one sentence.
func TestVerifyOfGoneCommit(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	other := composed(t, keys, []int{70}, []time.Time{at})
	file := filepath.Join(repo, ".git", "speedtrail", "ledger.db")
	call(t, "--repo", repo, "anchor", "c0", "--sign", "checker="+filepath.Join(keys, "ada"), "--sign", "approver="+filepath.Join(keys, "bea"), "--sign", "in-service="+filepath.Join(keys, "cem"), "--reason", "root", "-y").want(t, 0)
	got := call(t, "--repo", other, "--ledger", file, "verify").want(t, statusFinding)
	if !strings.Contains(got.out, "names cannot be read: object ") || strings.Contains(got.out, `\n`) {
		t.Error(got.out)
	}
}
