package main

import (
	"encoding/json"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// The register says where the line of approval begins, and who rejected what it calls
// rejected; a trace knows that the anchor holds what was before it.
func TestAnchorAndRejectionsInSight(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	repo := composed(t, keys, []int{60, 70, 80, 80}, []time.Time{at, at.Add(time.Hour), at.Add(2 * time.Hour), at.Add(3 * time.Hour)})
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	key := func(name string) string { return filepath.Join(keys, name) }
	call(t, in("anchor", "c1", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y", "-q")...).want(t, 0)

	var list struct {
		Anchors []struct {
			Folder, Revision, Recorded, Entry string
			SignOffs                          []string `json:"sign_offs"`
		}
		Assessments []struct {
			SignOffs []string `json:"sign_offs"`
		}
	}
	register := func() string {
		t.Helper()
		if err := json.Unmarshal([]byte(call(t, in("register", "--format", "json")...).want(t, 0).out), &list); err != nil {
			t.Fatal(err)
		}
		return call(t, in("register")...).want(t, 0).out
	}
	out := register()
	if len(list.Anchors) != 1 {
		t.Fatalf("%+v", list)
	}
	x := list.Anchors[0]
	revision := gitIn(t, repo, "rev-parse", "c1^{commit}")
	if x.Folder != "." || x.Revision != revision || !strings.HasPrefix(x.Entry, "2:") || strings.Join(x.SignOffs, ", ") != "checker ada@tarn.example, approver bea@tarn.example, in-service cem@tarn.example" {
		t.Errorf("%+v", x)
	}
	hash := strings.TrimPrefix(x.Entry, "2:")
	words := strings.Join(strings.Fields(out), " ")
	if !strings.Contains(words, "anchor of the folder .: commit "+revision+", recorded "+x.Recorded+" as entry 2, signed by checker ada@tarn.example, approver bea@tarn.example, in-service cem@tarn.example (root) verify --anchor "+hash+" No assessment") {
		t.Errorf("%s", out)
	}
	if got := call(t, in("verify", "--anchor", hash)...).want(t, 0); !strings.Contains(got.out, "proved: the policy root of the folder . is the one that was noted") {
		t.Errorf("%s", got.out)
	}

	call(t, in("assess", "c1", "c2")...).want(t, 1)
	call(t, in("assess", "c1", "c3")...).want(t, 1)
	call(t, in("sign", "1", "--role", "checker", "--decision", "reject", "--reason", "no", "--key", key("ada"), "-y")...).want(t, 0)
	out = register()
	if !strings.Contains(out, "reject as checker by ada@tarn.example, ") || !strings.Contains(strings.Join(strings.Fields(out), " "), "(on assessment 1, which has the same content)") || !strings.Contains(out, "\n  verify --anchor "+hash+"\n") {
		t.Errorf("%s", out)
	}
	if a := list.Assessments; len(a) != 2 || strings.Join(a[0].SignOffs, "") != "reject checker ada@tarn.example on assessment 1" || strings.Join(a[1].SignOffs, "") != "reject checker ada@tarn.example" {
		t.Errorf("%+v", a)
	}

	for _, c := range []struct {
		args []string
		want []string
	}{
		{[]string{"c3"}, []string{"in assessment 2 (rejected; reject checker ada@tarn.example on assessment 1)", "assessed approved, the anchor (entry 2)", "assessed in the history of what the anchor approved as a whole (entry 2)"}},
		{[]string{"c3", "--no-index"}, []string{"assessed in the history of what the anchor approved as a whole (entry 2)"}},
		// What is traced ends before the anchor.
		{[]string{"c0"}, []string{"assessed in the history of what the anchor approved as a whole (entry 2)"}},
	} {
		got := call(t, in(append([]string{"trace", "--route", "R1", "--at", "1.5", "--direction", "nominal"}, c.args...)...)...).want(t, 0)
		for _, want := range c.want {
			if !strings.Contains(strings.Join(strings.Fields(got.out), " "), want) {
				t.Errorf("%q: no %q in\n%s", c.args, want, got.out)
			}
		}
		if strings.Contains(got.out, "not assessed") {
			t.Errorf("%q: %s", c.args, got.out)
		}
	}
}
