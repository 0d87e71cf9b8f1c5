package main

import (
	"bytes"
	"database/sql"
	"encoding/json"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
	"time"

	"speedtrail/history/ledger"
)

// aLedger makes a repository of four revisions with a ledger in it. in gives the
// arguments of a call on it, key the file of a person's key.
func aLedger(t *testing.T) (file string, in func(...string) []string, key func(string) string) {
	t.Helper()
	keys := t.TempDir()
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	repo := composed(t, keys, []int{60, 80, 85, 90}, []time.Time{at, at.Add(time.Hour), at.Add(2 * time.Hour), at.Add(3 * time.Hour)})
	file = filepath.Join(repo, ".git", "speedtrail", "ledger.db")
	return file, func(args ...string) []string { return append([]string{"--repo", repo}, args...) }, func(name string) string { return filepath.Join(keys, name) }
}

var headForm = regexp.MustCompile(`[0-9]+:[0-9a-f]{64}`)

// headOf takes the head of the ledger out of what a call said.
func headOf(t *testing.T, c called) string {
	t.Helper()
	head := headForm.FindString(c.errors)
	if head == "" {
		t.Fatalf("%q names no head: %s", c.args[2:], c.errors)
	}
	return head
}

// The ledger was restored from yesterday's backup: on its own it looks good, the
// heads that were noted since show that something is missing, and what. What is
// recorded now goes on from there, and the noted heads keep showing it.
func TestRestoredLedger(t *testing.T) {
	file, in, key := aLedger(t)
	anchor := in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")
	call(t, anchor...).want(t, 0)
	yesterday := headOf(t, call(t, in("assess", "c0", "c1")...).want(t, 1))
	backup := readFileOf(t, file)
	call(t, in("sign", "1", "--role", "checker", "--decision", "reject", "--reason", "km 1.4 is wrong", "--key", key("ada"), "-y")...).want(t, 0)
	today := headOf(t, call(t, in("assess", "c1", "c2")...).want(t, 1))

	// Before: both are contained.
	if got := call(t, in("verify", "--against", yesterday, "--against", today)...).want(t, 0); !strings.Contains(got.out, "Nothing is wrong") {
		t.Error(got.out)
	}
	if err := os.WriteFile(file, backup, 0o644); err != nil {
		t.Fatal(err)
	}
	if got := call(t, in("verify")...).want(t, 0); !strings.Contains(oneLine(got.out), "left open: that no entry was removed from the end: no head that was noted elsewhere is given") {
		t.Errorf("alone it cannot know, and has to say so: %s", got.out)
	}
	call(t, in("verify", "--against", yesterday)...).want(t, 0)
	got := call(t, in("verify", "--against", yesterday, "--against", today)...).want(t, 1)
	if text := oneLine(got.out); !strings.Contains(text, "older copy") || !strings.Contains(text, today[:1]) || !strings.Contains(text, "1 thing is wrong") {
		t.Errorf("what is missing is not said: %s", got.out)
	}
	var v struct {
		Good     bool
		Head     string
		Problems []struct {
			Kind, Text string
		}
	}
	if err := json.Unmarshal([]byte(call(t, in("verify", "--against", today, "--format", "json")...).want(t, 1).out), &v); err != nil {
		t.Fatal(err)
	}
	if v.Good || v.Head != yesterday || len(v.Problems) != 1 || !strings.Contains(v.Problems[0].Text, strings.SplitN(today, ":", 2)[0]) {
		t.Errorf("%+v", v)
	}
	// The rejection is gone, and nothing but the noted head shows it.
	if got := call(t, in("register")...).want(t, 0); strings.Contains(got.out, "rejected") {
		t.Error(got.out)
	}
	// Work goes on, to the number of the head that was noted: that it is another
	// entry is found, too.
	call(t, in("assess", "c1", "c2")...).want(t, 1)
	other := headOf(t, call(t, in("assess", "c2", "c3")...).want(t, 1))
	if strings.SplitN(other, ":", 2)[0] != strings.SplitN(today, ":", 2)[0] || other == today {
		t.Fatalf("%s and %s", other, today)
	}
	got = call(t, in("verify", "--against", yesterday, "--against", other, "--against", today)...).want(t, 1)
	if text := oneLine(got.out); !strings.Contains(text, "1 thing is wrong") || !strings.Contains(text, "entry "+today[:1]+" is another one than the noted head says") {
		t.Errorf("%s", got.out)
	}
}

func oneLine(s string) string { return strings.Join(strings.Fields(s), " ") }

// firstFormatOf writes a ledger as the version of the tool did that knew only
// the first format: with its tables and no others.
func firstFormatOf(t *testing.T, from, to string) {
	t.Helper()
	schema := readFileOf(t, filepath.Join("..", "..", "history", "ledger", "migrations", "0001.sql"))
	db, err := sql.Open("sqlite3", "file:"+to)
	if err != nil {
		t.Fatal(err)
	}
	defer db.Close()
	db.SetMaxOpenConns(1)
	for _, statement := range []string{string(schema), "ATTACH 'file:" + from + "?mode=ro' AS source"} {
		if _, err := db.Exec(statement); err != nil {
			t.Fatal(err)
		}
	}
	for _, table := range []string{"entry", "assessment", "request", "preparer", "speed_change", "finding"} {
		if _, err := db.Exec("INSERT INTO main." + table + " SELECT * FROM source." + table); err != nil {
			t.Fatal(table, err)
		}
	}
	for _, statement := range []string{"DETACH source", "PRAGMA application_id = 1936749682", "PRAGMA user_version = 1"} { // "sptr"
		if _, err := db.Exec(statement); err != nil {
			t.Fatal(err)
		}
	}
}

// format reads the number of the format from the file's header.
func format(t *testing.T, file string) byte {
	t.Helper()
	return readFileOf(t, file)[63] // Database File Format, section 1.3
}

// Two versions of the tool on one ledger: every command that only reads leaves
// one of the first format as it is, to the byte; the first that writes raises it;
// one of a later format is left alone by all.
func TestTwoVersions(t *testing.T) {
	file, in, key := aLedger(t)
	call(t, in("assess", "c0", "c1")...).want(t, 1)
	head := headOf(t, call(t, in("assess", "c1", "c2")...).want(t, 1))
	report := call(t, in("report", "1", "--format", "json")...).want(t, 0).out
	entries := call(t, in("export")...).want(t, 0).out
	old := file + ".old"
	firstFormatOf(t, file, old)
	if err := os.Rename(old, file); err != nil {
		t.Fatal(err)
	}
	before := readFileOf(t, file)
	for _, c := range []struct {
		status int
		args   []string
		want   string
	}{
		{0, in("register"), "head " + head}, {0, in("register", "--format", "json"), head}, {0, in("report", "1", "--format", "json"), report}, {0, in("report", "2", "--format", "html"), "<html"},
		{0, in("export"), entries}, {0, in("verify", "--against", head), "Nothing is wrong"}, {0, in("trace", "c2", "--route", "R1", "--at", "1.5"), "assessment 2"},
		{0, in("inforce", "--when", "2026-03-05T00:00:00Z"), "Nothing is recorded"},
		{1, in("assess", "c0", "c1", "--no-record"), "60"},
	} {
		if got := call(t, c.args...).want(t, c.status); !strings.Contains(got.out, c.want) {
			t.Errorf("%q: %.2000s", c.args[2:], got.out)
		}
		if !bytes.Equal(readFileOf(t, file), before) {
			t.Fatalf("%q has altered the ledger, which is of format %d now", c.args[2:], format(t, file))
		}
	}
	// What is refused raises nothing that a reader of the older version would miss.
	call(t, in("sign", "1", "--role", "checker", "--decision", "approve", "--reason", "r", "--key", key("ada"), "-y")...).want(t, 2)
	if got := call(t, in("verify", "--against", head)...).want(t, 0); !strings.Contains(got.out, "head "+head) {
		t.Error(got.out)
	}
	// Signing needs the tables of the present format.
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	if f := format(t, file); f != ledger.Format {
		t.Errorf("it is of format %d", f)
	}
	call(t, in("sign", "1", "--role", "checker", "--decision", "approve", "--reason", "r", "--key", key("ada"), "-y")...).want(t, 0)
	if got := call(t, in("verify", "--against", head)...).want(t, 0); !strings.Contains(got.out, "Nothing is wrong") {
		t.Error(got.out)
	}
	if got := call(t, in("export")...).want(t, 0); !strings.HasPrefix(got.out, entries) {
		t.Error("the upgrade has altered an entry")
	}

	// The version after this one.
	later := readFileOf(t, file)
	later[63] = ledger.Format + 1
	if err := os.WriteFile(file, later, 0o644); err != nil {
		t.Fatal(err)
	}
	for _, args := range [][]string{
		in("register"), in("report", "1"), in("export"), in("verify"), in("inforce"), in("inforce", "--when", "2026-03-05T00:00:00Z"), in("assess", "c2", "c3"),
		in("sign", "1", "--role", "approver", "--decision", "approve", "--reason", "r", "--key", key("bea"), "-y"),
		in("anchor", "c0", "--sign", "checker="+key("ada"), "--reason", "root", "-y"), in("inforce", "record", "c0", "--since", "2026-03-03T00:00:00Z", "--reason", "r", "--key", key("cem"), "-y"),
	} {
		got := call(t, args...)
		if got.status != statusFailed || !strings.Contains(got.errors, "newer version") || !strings.Contains(got.errors, "hint:") {
			t.Errorf("%q: status %d, %s%s", args[2:], got.status, got.errors, got.out)
		}
		if !bytes.Equal(readFileOf(t, file), later) {
			t.Fatalf("%q has altered the ledger", args[2:])
		}
	}
}
