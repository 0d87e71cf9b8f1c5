package main

import (
	"fmt"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"speedtrail/history/compose"
)

// A speed that came and went between base and target of an assessment is none that the
// assessment speaks of: trace does not leave it beside "approved".
func TestTraceBetweenBaseAndTarget(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	keys := t.TempDir()
	var times []time.Time
	for i := range 4 {
		times = append(times, at.Add(time.Duration(i)*time.Hour))
	}
	repo := composed(t, keys, []int{60, 140, 80, 90}, times)
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	key := func(name string) string { return filepath.Join(keys, name) }
	call(t, in("anchor", "c0", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	call(t, in("assess", "c0", "c2")...).want(t, 1)
	call(t, in("sign", "1", "--role", "checker", "--decision", "approve", "--reason", "seen", "--key", key("ada"), "-y")...).want(t, 0)
	call(t, in("sign", "1", "--role", "approver", "--decision", "approve", "--reason", "good", "--key", key("bea"), "-y")...).want(t, 0)

	const said, beyond = "! assessment 1 did not judge this speed: a later commit or merge up to its target altered it", "! of a target that is not in this history"
	for _, format := range []string{"text", "csv", "html"} {
		for _, c := range []struct {
			rev          string
			said, beyond int
			before       string // the step behind which it is said
		}{{"c3", 1, 0, "60 -> 140"}, {"c2", 1, 0, "60 -> 140"}, {"c1", 0, 1, ""}} {
			got := call(t, in("trace", c.rev, "--route", "R1", "--at", "1.5", "--train", "T", "--direction", "nominal", "--format", format)...).want(t, 0)
			words := strings.Join(strings.Fields(got.out), " ")
			if strings.Count(words, said) != c.said || strings.Count(words, beyond) != c.beyond {
				t.Errorf("%s, %s: %s", format, c.rev, got.out)
			}
			if _, after, _ := strings.Cut(words, c.before); format == "text" && c.said > 0 && !strings.Contains(after, said) {
				t.Errorf("%s: it is said of another step: %s", c.rev, got.out)
			}
		}
	}
	if got := call(t, in("trace", "c3", "--route", "R1", "--at", "1.5", "--train", "T", "--direction", "nominal", "--format", "json")...).want(t, 0); strings.Count(strings.Join(strings.Fields(got.out), " "), `"overtaken": [ 1 ]`) != 1 {
		t.Errorf("%s", got.out)
	}
}

// A merge that goes back to a speed of before the target of an assessment leaves one
// that the assessment did not judge: its target had another.
func TestTraceAMergeThatTakesAnEarlierSpeed(t *testing.T) {
	keys, repo := t.TempDir(), filepath.Join(t.TempDir(), "repo")
	var list []compose.Commit
	for i, c := range []struct {
		speed   int
		parents []int
	}{{60, nil}, {140, []int{0}}, {80, []int{1}}, {140, []int{1, 2}}} {
		list = append(list, compose.Commit{
			Files: plainFiles(t, keys, c.speed), Author: compose.Person{Name: "Cem Orr", Email: "cem@tarn.example"}, When: time.Date(2026, 3, 1, 12+i, 0, 0, 0, time.UTC),
			Message: fmt.Sprintf("Commit %d\n", i), Tag: fmt.Sprintf("c%d", i), TagText: "Release\n", Parents: c.parents,
		})
	}
	if err := compose.Write(t.Context(), repo, list); err != nil {
		t.Fatal(err)
	}
	in := func(args ...string) []string { return append([]string{"--repo", repo}, args...) }
	key := func(name string) string { return filepath.Join(keys, name) }
	call(t, in("anchor", "c2", "--sign", "checker="+key("ada"), "--sign", "approver="+key("bea"), "--sign", "in-service="+key("cem"), "--reason", "root", "-y")...).want(t, 0)
	call(t, in("assess", "c0", "c2")...).want(t, 1)
	call(t, in("assess", "c0", "c1")...).want(t, 1)
	for _, place := range [][]string{{"--at", "1.5"}, {"--from", "1.35", "--to", "1.5"}} {
		for _, index := range []string{"--no-index=false", "--no-index"} {
			got := call(t, in(append([]string{"trace", "c3", index, "--route", "R1", "--train", "T", "--direction", "nominal"}, place...)...)...).want(t, 0)
			words := strings.Join(strings.Fields(got.out), " ")
			anchor := strings.Count(words, "! whoever signed the anchor did not judge this speed")
			if strings.Count(words, "! assessment 1 did not judge this speed") != 1 || strings.Contains(words, "! assessment 2 did not") || anchor != 1 {
				t.Errorf("%s", got.out)
			}
		}
	}
}
