package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"os/exec"
	"path/filepath"
	"reflect"
	"strings"
	"sync/atomic"
	"testing"
	"time"

	"speedtrail/history/revision"
	"speedtrail/schema"
)

// gitIn runs the git program in a repository, untouched by whoever runs the test.
func gitIn(t testing.TB, dir string, args ...string) string {
	t.Helper()
	if _, err := exec.LookPath("git"); err != nil {
		if os.Getenv("CI") == "true" {
			t.Fatal(err)
		}
		t.Skip("the git program is not installed")
	}
	c := exec.Command("git", args...)
	c.Dir = dir
	c.Env = append(os.Environ(), "GIT_CONFIG_GLOBAL="+os.DevNull, "GIT_CONFIG_NOSYSTEM=1", "LC_ALL=C",
		"GIT_AUTHOR_NAME=Cem Orr", "GIT_AUTHOR_EMAIL=cem@tarn.example", "GIT_COMMITTER_NAME=Cem Orr", "GIT_COMMITTER_EMAIL=cem@tarn.example")
	var errs bytes.Buffer
	c.Stderr = &errs
	out, err := c.Output()
	if err != nil {
		t.Fatalf("git %v: %v\n%s", args, err, &errs)
	}
	return strings.TrimSpace(string(out))
}

// hooked is a file system that does something before the nth look at it.
type hooked struct {
	fs.FS
	looks *atomic.Int32
	at    int32
	do    func()
}

func (h hooked) look() {
	if h.looks.Add(1) == h.at {
		h.do()
	}
}

func (h hooked) Open(name string) (fs.File, error) { h.look(); return h.FS.Open(name) }

func (h hooked) ReadDir(name string) ([]fs.DirEntry, error) { h.look(); return fs.ReadDir(h.FS, name) }

// readPair reads both revisions as assess does, with something done at a look.
func readPair(t *testing.T, dir, base, target string, at int32, do func()) (data [2]*schema.Dataset, looks int32, err error) {
	t.Helper()
	repo, err := revision.Open(dir)
	if err != nil {
		t.Fatal(err)
	}
	defer repo.Close()
	var count atomic.Int32
	var sides [2]hooked
	for i, hash := range []string{base, target} {
		files, err := repo.Snapshot(hash, ".")
		if err != nil {
			t.Fatal(err)
		}
		sides[i] = hooked{files, &count, at, do}
	}
	data[0], data[1], err = schema.LoadPair(context.Background(), sides[0], sides[1])
	return data, count.Load(), err
}

// At every step of reading two revisions, another process repacks, collects
// garbage, commits, or force-pushes and prunes the target away. What is kept is
// read as ever; what is gone is missing by name, and never half there.
func TestReadingWhileGitWorks(t *testing.T) {
	gitIn(t, t.TempDir(), "--version")
	keys := t.TempDir()
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	template := composed(t, keys, []int{60, 80}, []time.Time{at, at.Add(time.Hour)})
	base, target := gitIn(t, template, "rev-parse", "c0^{commit}"), gitIn(t, template, "rev-parse", "c1^{commit}")
	want, looks, err := readPair(t, template, base, target, 0, nil)
	if err != nil || looks < 12 {
		t.Fatal(looks, err)
	}
	push := func(dir string) {
		gitIn(t, dir, "tag", "-d", "c1")
		gitIn(t, dir, "reset", "-q", "--hard", "c0")
		gitIn(t, dir, "commit", "-q", "--allow-empty", "-m", "another history")
		gitIn(t, dir, "reflog", "expire", "--expire=now", "--expire-unreachable=now", "--all")
		gitIn(t, dir, "gc", "-q", "--prune=now")
	}
	for name, action := range map[string]struct {
		do   func(dir string)
		lost bool // whether the target is
	}{
		"repack":           {func(dir string) { gitIn(t, dir, "repack", "-adfq") }, false},
		"gc --prune=now":   {func(dir string) { gitIn(t, dir, "gc", "-q", "--prune=now") }, false},
		"a new commit":     {func(dir string) { gitIn(t, dir, "commit", "-q", "--allow-empty", "-m", "new") }, false},
		"a force-push":     {push, true},
		"packs made loose": {loosen(t), false},
	} {
		t.Run(name, func(t *testing.T) {
			t.Parallel()
			missing := 0
			for step := int32(1); step <= looks; step++ {
				dir := filepath.Join(t.TempDir(), "repo")
				if err := os.CopyFS(dir, os.DirFS(template)); err != nil {
					t.Fatal(err)
				}
				got, _, err := readPair(t, dir, base, target, step, func() { action.do(dir) })
				switch {
				case err == nil && same(got, want):
				case err == nil:
					t.Errorf("at step %d of %d other data was read", step, looks)
				case action.lost && errors.Is(err, revision.ErrMissingObject) && strings.Contains(err.Error(), "is not in the repository"):
					missing++
				default:
					t.Errorf("at step %d of %d: %v", step, looks, err)
				}
			}
			if action.lost && (missing == 0 || missing > int(looks)) {
				t.Errorf("missing at %d of %d steps", missing, looks)
			}
		})
	}
}

func same(a, b [2]*schema.Dataset) bool {
	for i := range a {
		if len(a[i].Files) != len(b[i].Files) || !reflect.DeepEqual(a[i].Files, b[i].Files) || !reflect.DeepEqual(a[i].Unread, b[i].Unread) {
			return false
		}
	}
	return true
}

// loosen packs everything and unpacks it again, so that objects move twice.
func loosen(t *testing.T) func(dir string) {
	return func(dir string) {
		gitIn(t, dir, "repack", "-adq")
		packs, err := filepath.Glob(filepath.Join(dir, ".git", "objects", "pack", "*.pack"))
		if err != nil || len(packs) != 1 {
			t.Error(packs, err)
			return
		}
		pack := packs[0] + ".out"
		if err := os.Rename(packs[0], pack); err != nil {
			t.Error(err)
			return
		}
		os.Remove(strings.TrimSuffix(packs[0], ".pack") + ".idx")
		c := exec.Command("git", "unpack-objects", "-q")
		c.Dir = dir
		if c.Stdin, err = os.Open(pack); err != nil {
			t.Error(err)
			return
		}
		if out, err := c.CombinedOutput(); err != nil {
			t.Errorf("%v: %s", err, out)
		}
	}
}

// assess, validate and trace give the same bytes again and again while another
// process commits, repacks, prunes and force-pushes beside the branch they read.
func TestCommandsWhileGitWorks(t *testing.T) {
	gitIn(t, t.TempDir(), "--version")
	at := time.Date(2026, 3, 1, 12, 0, 0, 0, time.UTC)
	speeds, times := []int{}, []time.Time{}
	for i := range 12 {
		speeds, times = append(speeds, 60+5*(i%4)), append(times, at.Add(time.Duration(i)*time.Hour))
	}
	dir := composed(t, t.TempDir(), speeds, times)
	commands := [][]string{
		{"--repo", dir, "assess", "c0", "c11", "--no-record", "--format", "json"},
		{"--repo", dir, "assess", "c3", "c6", "--no-record", "--format", "html"},
		{"--repo", dir, "validate", "c11"},
		{"--repo", dir, "trace", "c11", "--route", "R1", "--at", "1.5", "--no-index", "--format", "csv"},
		{"--repo", dir, "trace", "c11", "--route", "R1", "--from", "1", "--to", "3", "--no-index", "--format", "json"},
	}
	var want []string
	for _, args := range commands {
		got := call(t, args...)
		if got.status > 1 {
			t.Fatal(got.errors)
		}
		want = append(want, got.out)
	}
	gitIn(t, dir, "checkout", "-q", "-b", "other")
	done := make(chan struct{})
	go func() {
		defer close(done)
		for n := range 8 {
			// The branch moves on and is thrown away again.
			for k := range 3 {
				if err := os.WriteFile(filepath.Join(dir, "routes", "r1", "speed.csv"), fmt.Appendf(nil, "from_km,to_km,basic\n0,5,%d\n", 60+5*(n+k)), 0o644); err != nil {
					t.Error(err)
				}
				gitIn(t, dir, "commit", "-q", "-a", "-m", "other")
			}
			gitIn(t, dir, [][]string{{"repack", "-adq"}, {"repack", "-dq"}, {"pack-refs", "--all"}, {"gc", "-q", "--prune=now"}}[n%4]...)
			gitIn(t, dir, "reset", "-q", "--hard", "main")
			gitIn(t, dir, "reflog", "expire", "--expire=now", "--expire-unreachable=now", "--all")
			gitIn(t, dir, "gc", "-q", "--prune=now")
		}
	}()
	rounds := 0
	for running := true; running; rounds++ {
		select {
		case <-done:
			running = false
		default:
		}
		for i, args := range commands {
			if got := call(t, args...); got.out != want[i] || got.status > 1 {
				t.Errorf("round %d, %q: status %d, %s; %d bytes, want %d", rounds, args[2:], got.status, got.errors, len(got.out), len(want[i]))
			}
		}
		if t.Failed() {
			<-done
			return
		}
	}
	if rounds < 3 {
		t.Errorf("%d rounds are no test", rounds)
	}
	// The history that was read is thrown away: the commands say so.
	for i := range 12 {
		gitIn(t, dir, "tag", "-d", fmt.Sprint("c", i))
	}
	old := gitIn(t, dir, "rev-parse", "main")
	gitIn(t, dir, "checkout", "-q", "--orphan", "fresh")
	gitIn(t, dir, "commit", "-q", "-m", "fresh")
	gitIn(t, dir, "branch", "-q", "-D", "main", "other")
	gitIn(t, dir, "reflog", "expire", "--expire=now", "--expire-unreachable=now", "--all")
	gitIn(t, dir, "gc", "-q", "--prune=now")
	for _, args := range [][]string{{"assess", old, "HEAD", "--no-record"}, {"validate", old}, {"trace", old, "--route", "R1", "--at", "1.5"}, {"validate", "main"}} {
		got := call(t, append([]string{"--repo", dir}, args...)...).want(t, statusInput)
		if got.out != "" || !strings.Contains(got.errors, "unknown revision") || !strings.Contains(got.errors, "hint:") {
			t.Errorf("%q: %s%s", args, got.errors, got.out)
		}
	}
	call(t, "--repo", dir, "validate", "HEAD").want(t, 0)
}
