package main

import (
	"encoding/json"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"golang.org/x/crypto/ssh"
)

// fingerprintOf is that of a key of testKey.
func fingerprintOf(t *testing.T, name string) string {
	t.Helper()
	_, public := testKey(t, t.TempDir(), name)
	key, _, _, _, err := ssh.ParseAuthorizedKey([]byte(public))
	if err != nil {
		t.Fatal(err)
	}
	return ssh.FingerprintSHA256(key)
}

// Wherever a signature is shown, it is said that its key was revoked later: nobody has
// to look into the register before he trusts an approval.
func TestRevokedKeyIsSaid(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	key := func(name string) string { return filepath.Join(keys, name) }
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	call(t, in("inforce", "record", "c0", "--since", "2026-03-03T00:00:00Z", "--reason", "start", "--key", key("cem"), "-y")...).want(t, 0)
	call(t, in("assess", "c0", "c1")...).want(t, 1)
	call(t, in("sign", "1", "--role", "checker", "--decision", "approve", "--reason", "seen", "--key", key("ada"), "-y")...).want(t, 0)
	call(t, in("sign", "1", "--role", "approver", "--decision", "approve", "--reason", "good", "--key", key("bea"), "-y")...).want(t, 0)
	call(t, in("inforce", "record", "c1", "--since", "2026-03-04T00:00:00Z", "--reason", "next", "--key", key("cem"), "-y")...).want(t, 0)

	commands := map[string]struct {
		args []string
		// how often each key is spoken of once it is revoked
		ada, cem int
	}{
		"text":        {[]string{"report", "1"}, 1, 0},
		"html":        {[]string{"report", "1", "--format", "html"}, 1, 0},
		"markdown":    {[]string{"report", "1", "--format", "markdown"}, 1, 0},
		"register":    {[]string{"register"}, 2, 1},
		"in force":    {[]string{"inforce"}, 2, 2 + 1}, // of the anchor and of assessment 1; of both records and of the anchor
		"then":        {[]string{"inforce", "--when", "2026-03-05T00:00:00Z"}, 2, 2},
		"then, first": {[]string{"inforce", "--when", "2026-03-03T12:00:00Z"}, 2, 4},
		"trace":       {[]string{"trace", "c1", "--route", "R1", "--at", "1.5", "--direction", "nominal"}, 2, 1},
		"trace, csv":  {[]string{"trace", "c1", "--route", "R1", "--at", "1.5", "--direction", "nominal", "--format", "csv"}, 2, 1},
		"trace, html": {[]string{"trace", "c1", "--route", "R1", "--at", "1.5", "--direction", "nominal", "--format", "html"}, 2, 1},
	}
	said := func(out, entry string) int {
		return strings.Count(strings.Join(strings.Fields(out), " "), "key revoked in entry "+entry)
	}
	for name, c := range commands {
		if got := call(t, in(c.args...)...); said(got.out, "") != 0 {
			t.Errorf("%s, before: %s", name, got.out)
		}
	}
	for _, who := range []string{"ada", "cem"} {
		by := []string{"--role", "owner", "--key", key(who)}
		got := call(t, in(append(by, "revoke", fingerprintOf(t, who), "--reason", "laptop stolen", "-y")...)...).want(t, 0)
		want := []string{"review the anchor of the folder ., entry 2: ada@tarn.example signed it as checker", "review assessment 1: ada@tarn.example signed it as checker (approve) with this key"}
		if who == "cem" {
			want = []string{"review the anchor of the folder ., entry 2: cem@tarn.example signed it as in-service", "service of entry 3: cem@tarn.example", "service of entry 7: cem@tarn.example"}
		}
		for _, text := range want {
			if !strings.Contains(got.out, text) {
				t.Errorf("%s: no %q in\n%s", who, text, got.out)
			}
		}
		// It is said to whoever puts the revision into service then.
		if who == "ada" {
			got := call(t, in("inforce", "record", "c1", "--since", "2026-03-06T00:00:00Z", "--reason", "again", "--signer", "cem@tarn.example", "--write", filepath.Join(t.TempDir(), "statement"))...).want(t, 0)
			if !strings.Contains(got.errors, "! assessment 1: approve as checker by ada@tarn.example: key revoked in entry 8") {
				t.Errorf("%s", got.errors)
			}
		}
	}
	for name, c := range commands {
		got := call(t, in(c.args...)...)
		if ada, cem := said(got.out, "8"), said(got.out, "9"); ada != c.ada || cem != c.cem {
			t.Errorf("%s: said %d times of ada's key, %d of cem's, want %d and %d\n%s", name, ada, cem, c.ada, c.cem, got.out)
		}
	}
	if got := call(t, in("report", "1")...); !strings.Contains(got.out, "\napproved; ! signed with a key that was revoked later\n") {
		t.Errorf("not beside the state: %s", got.out)
	}
	for _, format := range []string{"text", "markdown"} {
		if got := call(t, in("report", "1", "--format", format)...); !strings.Contains(oneLine(got.out[:200]), "(assessment 1, approved; ! signed with a key that was revoked later)") {
			t.Errorf("%s, not in the title: %s", format, got.out)
		}
	}
	if got := call(t, in("register")...); !strings.Contains(got.out, "1  ") || !strings.Contains(got.out, "  approved\n") {
		t.Errorf("the state is another one: %s", got.out)
	}

	// The JSON forms have members for it.
	decode := func(to any, args ...string) {
		t.Helper()
		if err := json.Unmarshal([]byte(call(t, in(append(args, "--format", "json")...)...).out), to); err != nil {
			t.Fatal(err)
		}
	}
	type revoked struct {
		Of     int
		Entry  int64
		Reason string
	}
	var report struct {
		Record struct {
			SignOffs []struct {
				Revoked *revoked `json:"key_revoked"`
			} `json:"sign_offs"`
		}
	}
	decode(&report, "report", "1")
	if s := report.Record.SignOffs; len(s) != 2 || s[0].Revoked == nil || *s[0].Revoked != (revoked{0, 8, "laptop stolen"}) || s[1].Revoked != nil {
		t.Errorf("report: %+v", report)
	}
	var register struct{ Assessments []struct{ Revoked []revoked } }
	decode(&register, "register")
	if a := register.Assessments; len(a) != 1 || len(a[0].Revoked) != 1 || a[0].Revoked[0] != (revoked{0, 8, "laptop stolen"}) {
		t.Errorf("register: %+v", register)
	}
	var log struct {
		Records []struct {
			Revoked *revoked `json:"key_revoked"`
			Review  []struct {
				Assessment int64
				Decision   string
				Revoked    *revoked `json:"key_revoked"`
			}
		}
	}
	decode(&log, "inforce")
	if r := log.Records; len(r) != 2 || r[1].Revoked == nil || r[1].Revoked.Entry != 9 || len(r[1].Review) != 1 || r[1].Review[0].Assessment != 1 || r[1].Review[0].Revoked.Entry != 8 ||
		len(r[0].Review) != 2 || r[0].Review[0].Decision != "anchor" {
		t.Errorf("inforce: %+v", log)
	}
	var trace struct {
		Commits []struct {
			AnchorRevoked []revoked `json:"anchor_revoked"`
			Assessments   []struct{ Revoked []revoked }
		}
	}
	decode(&trace, "trace", "c1", "--route", "R1", "--at", "1.5")
	if c := trace.Commits; len(c) != 2 || len(c[0].Assessments) != 1 || len(c[0].Assessments[0].Revoked) != 1 || c[0].Assessments[0].Revoked[0].Entry != 8 || len(c[1].AnchorRevoked) != 2 || c[1].AnchorRevoked[1].Of != 2 {
		t.Errorf("trace: %+v", trace)
	}

	// And to whoever signs last.
	got := call(t, in("sign", "1", "--role", "approver", "--decision", "approve", "--reason", "again", "--key", key("bea"), "-y")...).want(t, 0)
	if !strings.Contains(got.errors, "! approve as checker by ada@tarn.example: key revoked in entry 8") {
		t.Errorf("%s", got.errors)
	}
}
