package main

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// What requests and accepted.toml name and the revision does not have is remarked on
// where it stands, with what can have been meant.
func TestDoubtfulNames(t *testing.T) {
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	repo := composed(t, t.TempDir(), []int{80}, []time.Time{at})
	write := func(name string, lines ...string) {
		t.Helper()
		if err := os.WriteFile(filepath.Join(repo, filepath.FromSlash(name)), []byte(strings.Join(lines, "\n")+"\n"), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	remove := func(name string) {
		t.Helper()
		if err := os.Remove(filepath.Join(repo, filepath.FromSlash(name))); err != nil {
			t.Fatal(err)
		}
	}
	remove("requests/always-one.toml")
	write("requests/a.toml",
		`id = "CR-1"`, `title = "A"`, `reason = "B"`,
		"[[declares]]", `route = "R2"`, "from_km = 1", "to_km = 2", `effect = "any"`,
		"[[declares]]", `route = "R1"`, "from_km = 1", "to_km = 7.5", `effect = "any"`, `trains = ["T", "Tt"]`,
		"[[declares]]", `route = "elsewhere"`, "from_km = 1", "to_km = 2", `effect = "any"`)
	write("accepted.toml",
		"[[accepted]]", `finding = "stepsize"`, `route = "R1"`, "from_km = 1", "to_km = 2", `reason = "C"`,
		"[[accepted]]", `finding = "crossing-warning"`, `route = "R1"`, "from_km = 2", "to_km = 2", `reason = "a point"`,
		"[[accepted]]", `finding = "frobnication"`, `route = "R1"`, "from_km = 1", "to_km = 2", `reason = "C"`,
		"[[accepted]]", `finding = "outside"`, `route = "R1"`, "from_km = 1", "to_km = 2", `reason = "C"`)
	write("routes/r1/axle-load.csv", "from_km,to_km,C2,note", "1,2,60,", "2,3,,a cell was lost")
	got := call(t, "--repo", repo, "validate").want(t, 0)
	var remarks []string
	for line := range strings.Lines(got.errors) {
		if !strings.Contains(line, "dataset.toml") {
			remarks = append(remarks, strings.TrimPrefix(strings.TrimSpace(line), "remark: "))
		}
	}
	want := []string{
		`routes/r1/axle-load.csv:3:1: the row gives no speed to any category and restricts no train`,
		`requests/a.toml:5:9: request CR-1 names route "R2", which is not in this revision; did you mean R1?`,
		`requests/a.toml:12:9: request CR-1: on route R1, to_km 7.500 is outside the route, which runs from 0.000 to 5.000`,
		`requests/a.toml:14:16: request CR-1 names train "Tt", which is not in this revision; did you mean T?`,
		`requests/a.toml:16:9: request CR-1 names route "elsewhere", which is not in this revision`,
		`requests/a.toml:1:1: request CR-1: assess refuses it where it is in play and names what neither side has`,
		`accepted.toml:2:11: the entry accepts nothing: "stepsize" is none of the findings that can be accepted; did you mean step-size?`,
		`accepted.toml:14:11: the entry accepts nothing: "frobnication" is none of the findings that can be accepted; these are: curve-speed, crossing-warning, cant-excess, category-order, axle-load-order, axle-load-missing, short-stretch, step-size, temporary-expired, temporary-without-effect, delay-over-bridge, delay-one-sided`,
		`accepted.toml:20:11: the entry accepts nothing: "outside" is none of the findings that can be accepted; these are: curve-speed, crossing-warning, cant-excess, category-order, axle-load-order, axle-load-missing, short-stretch, step-size, temporary-expired, temporary-without-effect, delay-over-bridge, delay-one-sided`,
	}
	if strings.Join(remarks, "\n") != strings.Join(want, "\n") {
		t.Errorf("got\n%s\nwant\n%s", strings.Join(remarks, "\n"), strings.Join(want, "\n"))
	}
	// A new entry with a mistyped name is said not to count, with what was meant.
	if got := call(t, "--repo", repo, "assess", "HEAD", "--request", "none").want(t, 1); !strings.Contains(oneLine(got.out), "stepsize on R1 km 1.000 to 2.000, does not count: a finding of this kind cannot be accepted; did you mean step-size?") {
		t.Error(got.out)
	}
	// What can be on no track is a fault already when it is read; what can be on another
	// one than this, such as that of the base, is not.
	for _, x := range []struct {
		to, says string
		validate int
	}{
		{"1", "to_km 1.000 does not lie after from_km 2.000", 0},
		{"2", "to_km 2.000 is the place of from_km", statusInput},
	} {
		write("requests/a.toml", `id = "CR-1"`, `title = "A"`, `reason = "B"`, "[[declares]]", `route = "R1"`, "from_km = 2", "to_km = "+x.to, `effect = "any"`)
		for command, status := range map[string]int{"validate": x.validate, "assess HEAD": statusInput} {
			args := append([]string{"--repo", repo}, strings.Fields(command)...)
			if got := call(t, args...).want(t, status); !strings.Contains(got.out+got.errors, "requests/a.toml:7:9: ") || !strings.Contains(oneLine(got.out+got.errors), x.says) {
				t.Errorf("%q: %s%s", args, got.out, got.errors)
			}
		}
	}
}
