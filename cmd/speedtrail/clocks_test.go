package main

import (
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
	"time"

	"speedtrail/history/compose"
)

// plainFiles is a small data set with a policy, whose middle kilometre has a speed.
func plainFiles(t testing.TB, keys string, speed int) map[string]string {
	signoff, signers := policyOf(t, keys)
	return map[string]string{
		"signoff.toml": signoff, "allowed_signers": signers,
		"dataset.toml":             "format = 1\nname = \"Plain\"\n",
		"trains.toml":              "[[train]]\nid = \"T\"\nname = \"Train\"\ncant_deficiency_mm = 80\naxle_load = \"C2\"\nlength_m = 300\nmax_speed_kmh = 140\n",
		"routes/r1/route.toml":     "id = \"R1\"\nname = \"Route\"\nstart_km = 0\nend_km = 5\n",
		"routes/r1/speed.csv":      fmt.Sprintf("from_km,to_km,basic\n0,1,100\n1,2,%d\n2,5,100\n", speed),
		"routes/r1/temporary.csv":  "id,from_km,to_km,speed,valid_from,valid_to\nTSR,3,4,40,2020-01-01T00:00:00Z,2030-01-01T00:00:00Z\n",
		"requests/always-one.toml": "id = \"CR\"\ntitle = \"T\"\nreason = \"R\"\n",
	}
}

// composed writes commits of the data set, one a speed and an instant, with tags
// c0, c1, ... Ada's hand is in none of them.
func composed(t testing.TB, keys string, speeds []int, at []time.Time) (dir string) {
	t.Helper()
	dir = filepath.Join(t.TempDir(), "repo")
	var list []compose.Commit
	for i, v := range speeds {
		c := compose.Commit{
			Files: plainFiles(t, keys, v), Author: compose.Person{Name: "Cem Orr", Email: "cem@tarn.example"}, When: at[i],
			Message: fmt.Sprintf("Commit %d\n", i), Tag: fmt.Sprintf("c%d", i), TagText: "Release\n",
		}
		if i > 0 {
			c.Parents = []int{i - 1}
		}
		list = append(list, c)
	}
	if err := compose.Write(t.Context(), dir, list); err != nil {
		t.Fatal(err)
	}
	return dir
}

// Commits may bear any instant that Git can write, in any offset, and later
// ones may be older than their parents: everything is computed and written all
// the same, in UTC.
func TestClocks(t *testing.T) {
	zone := func(hours int) *time.Location { return time.FixedZone("", hours*3600) }
	for _, c := range []struct {
		name   string
		at     time.Time
		inUTC  string // as reports write it
		masked bool   // whether the temporary restriction is in force then
	}{
		{"1970", time.Unix(0, 0).UTC(), "1970-01-01T00:00:00Z", false},
		{"just after 1970, by a clock in the west", time.Unix(3600, 0).In(zone(-11)), "1970-01-01T01:00:00Z", false},
		{"the last second of 31 bits", time.Unix(1<<31-1, 0).UTC(), "2038-01-19T03:14:07Z", false},
		{"past 31 bits", time.Unix(1<<31, 0).UTC(), "2038-01-19T03:14:08Z", false},
		{"past 32 bits", time.Unix(1<<32+1, 0).UTC(), "2106-02-07T06:28:17Z", false},
		{"the last second of 9999", time.Date(9999, 12, 31, 23, 59, 59, 0, time.UTC), "9999-12-31T23:59:59Z", false},
		{"the same where it is 10000 already", time.Date(9999, 12, 31, 23, 59, 59, 0, time.UTC).In(zone(14)), "9999-12-31T23:59:59Z", false},
		{"the same in the west", time.Date(9999, 12, 31, 23, 59, 59, 0, time.UTC).In(zone(-12)), "9999-12-31T23:59:59Z", false},
		{"today, in the west", time.Date(2026, 3, 1, 23, 30, 0, 0, zone(-9)), "2026-03-02T08:30:00Z", true},
	} {
		t.Run(c.name, func(t *testing.T) {
			keys := t.TempDir()
			base := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
			repo := composed(t, keys, []int{60, 80}, []time.Time{base, c.at})
			in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
			for _, format := range []string{"text", "html", "markdown", "csv", "json"} {
				got := call(t, in("assess", "c0", "c1", "--format", format)...).want(t, 1)
				if err := invisible(got.out); err != nil {
					t.Errorf("%s: %v", format, err)
				}
				if format == "json" && !strings.Contains(got.out, `"committed": "`+c.inUTC+`"`) {
					t.Errorf("the target's time is not %s", c.inUTC)
				}
				if again := call(t, in("report", "1", "--format", format)...).want(t, 0); again.out == "" {
					t.Errorf("no report as %s", format)
				}
			}
			if got := call(t, in("profile", "c1", "--route", "R1", "--train", "T", "--direction", "nominal", "--format", "csv", "--on", c.inUTC)...).want(t, 0); strings.Contains(got.out, "temporary TSR 40") != c.masked {
				t.Errorf("on %s: %s", c.inUTC, got.out)
			}
			for _, format := range []string{"text", "csv", "json", "html"} {
				for _, index := range [][]string{{}, {}, {"--no-index"}} {
					got := call(t, append(in("trace", "c1", "--route", "R1", "--at", "1.5", "--format", format), index...)...).want(t, 0)
					if list := inert(format, got.out); len(list) > 0 {
						t.Errorf("%s: %v", format, list)
					}
					if format == "csv" && !strings.Contains(got.out, ","+c.inUTC+",") {
						t.Errorf("no change at %s: %s", c.inUTC, got.out)
					}
				}
			}
			sign := func(name string) string { return filepath.Join(keys, name) }
			call(t, in("anchor", "c0", "--sign", "checker="+sign("ada"), "--sign", "approver="+sign("bea"), "--sign", "in-service="+sign("cem"), "--reason", "root", "-y")...).want(t, 0)
			call(t, in("inforce", "record", "c0", "--since", "2026-03-03T00:00:00Z", "--reason", "start", "--key", sign("cem"), "-y")...).want(t, 0)
			call(t, in("inforce", "record", "c1", "--since", "2026-03-04T00:00:00Z", "--reason", "next", "--key", sign("cem"), "-y")...).want(t, 0)
			for _, x := range []struct{ when, want string }{
				{"1900-01-01T00:00:00Z", "Nothing is recorded"}, {"2026-03-03T12:00:00Z", "60 km/h"}, {"2026-03-04T00:00:00Z", "80 km/h"}, {"2039-01-01T00:00:00Z", "80 km/h"}, {"9999-12-31T23:59:59Z", "80 km/h"},
			} {
				got := call(t, in("inforce", "--when", x.when, "--route", "R1", "--at", "1.5")...)
				if !strings.Contains(got.out, x.want) {
					t.Errorf("in force at %s: status %d, %s%s", x.when, got.status, got.out, got.errors)
				}
			}
			if got := call(t, in("verify")...).want(t, 0); !strings.Contains(got.out, "Nothing is wrong") {
				t.Error(got.out)
			}
		})
	}
}

// dated gives a commit like another one, with another time, by the git program:
// that of compose writes no such times.
func dated(t *testing.T, repo, commit, time string) (hash string) {
	t.Helper()
	if _, err := exec.LookPath("git"); err != nil {
		if os.Getenv("CI") == "true" {
			t.Fatal(err)
		}
		t.Skip("the git program is not installed")
	}
	git := func(stdin string, args ...string) string {
		c := exec.Command("git", append([]string{"-C", repo}, args...)...)
		c.Stdin = strings.NewReader(stdin)
		out, err := c.Output()
		if err != nil {
			t.Fatal(args, err)
		}
		return string(out)
	}
	text := regexp.MustCompile(`(?m)^(author|committer) (.*>).*$`).ReplaceAllString(git("", "cat-file", "commit", commit), "$1 $2"+time)
	return strings.TrimSpace(git(text, "hash-object", "-t", "commit", "-w", "--stdin", "--literally"))
}

// What stands in a commit and is no time from 1970 to 9999 is none: it is not
// made up, and the rest is read all the same.
func TestNoTime(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	repo := composed(t, t.TempDir(), []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	for name, written := range map[string]string{
		"before 1970": " -86400 +0000", "past 9999": " 253402300800 +0000", "past 64 bits": " 99999999999999999999 +0000", "nothing": "", "a word": " yesterday +0000",
	} {
		t.Run(name, func(t *testing.T) {
			target := dated(t, repo, "c1", written)
			for _, format := range []string{"text", "html", "json", "markdown"} {
				// As a base it is shown; of a target the terms of restrictions hang on it.
				noTime(t, "--repo", repo, "assess", target, "c1", "--no-record", "--format", format)
				if got := call(t, "--repo", repo, "assess", "c0", target, "--no-record", "--format", format); got.status != statusInput || !strings.Contains(got.errors, "no time that can be read") {
					t.Errorf("status %d\n%s", got.status, got.errors)
				}
			}
			for _, format := range []string{"text", "html", "json", "csv"} {
				noTime(t, "--repo", repo, "trace", target, "--route", "R1", "--at", "1.5", "--no-index", "--format", format)
				noTime(t, "--repo", repo, "trace", target, "--route", "R1", "--from", "1", "--to", "3", "--format", format)
			}
			noTime(t, "--repo", repo, "validate", target)
		})
	}
}

func noTime(t *testing.T, args ...string) {
	t.Helper()
	got := call(t, args...)
	if got.status > 1 || got.out == "" {
		t.Errorf("%q: status %d\n%s", args[2:], got.status, got.errors)
	}
	for _, made := range []string{"0001-01-01", "1969-12-31", "1970-01-01", "10000-01-01"} {
		if i := strings.Index(got.out, made); i >= 0 {
			t.Errorf("%q: the time %s is made up: %q", args[2:], made, got.out[max(0, i-80):min(len(got.out), i+40)])
		}
	}
}

// A clock that goes back between two entries is recorded as it stood, and what
// was recorded stays whole.
func TestClockGoesBack(t *testing.T) {
	keys := t.TempDir()
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	repo := composed(t, keys, []int{60, 80, 85}, []time.Time{at, at.Add(time.Hour), at.Add(2 * time.Hour)})
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	// A first entry from the future: as if the clock had been put right since.
	late := &app{in: strings.NewReader(""), out: os.Stderr, err: os.Stderr, repo: repo, data: ".", quiet: true}
	l, err := late.openLedgerAt(t.Context(), time.Date(2090, 1, 1, 0, 0, 0, 0, time.UTC))
	if err != nil {
		t.Fatal(err)
	}
	if err := l.Close(); err != nil {
		t.Fatal(err)
	}
	call(t, in("assess", "c0", "c1")...).want(t, 1)
	key := func(name string) string { return filepath.Join(keys, name) }
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	call(t, in("sign", "1", "--role", "checker", "--decision", "approve", "--reason", "seen", "--key", key("ada"), "-y")...).want(t, 0)
	if got := call(t, in("sign", "1", "--role", "approver", "--decision", "approve", "--reason", "seen", "--key", key("bea"), "-y")...).want(t, 0); !strings.Contains(got.errors, "assessment 1 is approved") {
		t.Error(got.errors)
	}
	if got := call(t, in("verify")...).want(t, 0); !strings.Contains(got.out, "5 entries form one chain") || !strings.Contains(got.out, "Nothing is wrong") {
		t.Error(got.out)
	}
	rows := call(t, in("export")...).want(t, 0).out
	if !strings.Contains(rows, `"seq":1,"time":"2090-01-01T00:00:00Z"`) || strings.Count(rows, `"time":"20`) != 5 || strings.Count(rows, `"time":"2090`) != 1 {
		t.Errorf("entries do not bear the times of the clock: %s", rows)
	}
}

// A newest entry from the future bars signatures until another one follows: the
// refusal says so, and verify says afterwards where times go back, as a remark.
func TestEntryFromTheFuture(t *testing.T) {
	keys := t.TempDir()
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	repo := composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	key := func(name string) string { return filepath.Join(keys, name) }
	late := &app{in: strings.NewReader(""), out: os.Stderr, err: os.Stderr, repo: repo, data: ".", quiet: true}
	l, err := late.openLedgerAt(t.Context(), time.Date(2099, 12, 31, 0, 0, 0, 0, time.UTC))
	if err != nil {
		t.Fatal(err)
	}
	if err := l.Close(); err != nil {
		t.Fatal(err)
	}
	anchor := in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")
	got := call(t, anchor...)
	if got.status != statusInput || !strings.Contains(got.errors, "before the entry 1 that it names, of 2099") || !strings.Contains(got.errors, "hint: nothing was recorded; put the clock right") || !strings.Contains(got.errors, "record an assessment") {
		t.Errorf("status %d\n%s", got.status, got.errors)
	}
	if got := call(t, in("verify")...).want(t, 0); strings.Contains(got.out, "which clock") {
		t.Errorf("one entry goes back: %s", got.out)
	}
	call(t, in("assess", "c0", "c1")...).want(t, 1)
	call(t, anchor...).want(t, 0)
	for _, format := range []string{"text", "json"} {
		got := call(t, in("verify", "--format", format)...).want(t, 0)
		if words := strings.Join(strings.Fields(got.out), " "); strings.Count(words, "which clock was right: by their times entry 2 was recorded before entry 1") != 1 || strings.Contains(words, "entry 3 was") {
			t.Error(got.out)
		}
	}
}
